// A run while it is done: what it comes to is shown after each row; what is typed outlives a reload.
import { forget, keep, restore } from "../widgets/draft.js";

const form = document.querySelector("form[data-run]");
if (form) watch(form);

function watch(form) {
  const place = `run ${form.dataset.run}`;
  // a form that the server answered with holds what was typed already
  if (!("typed" in form.dataset)) {
    const { changed, homeless } = restore(form, place);
    if (makeRoom(form, homeless)) return;
    if (changed) tell(form, place);
  }
  let timer = 0;
  form.addEventListener("input", () => keep(form, place));
  form.addEventListener("change", () => {
    clearTimeout(timer);
    timer = setTimeout(() => void workOut(form), 300);
  });
  form.addEventListener("submit", (event) => {
    if (event.submitter?.value === "record") forget(place);
  });
}

// Rows that were added, and air read at each weighing, have no fields on a fresh page: the server
// shows the form again with room for them, and with all that was typed.
function makeRoom(form, homeless) {
  const rows = Object.keys(homeless).map((name) => Number(/^[a-z](\d+)_/.exec(name)?.[1] ?? -1));
  const most = Math.max(-1, ...rows);
  if (most < 0) return false;
  for (const [name, value] of Object.entries(homeless)) add(form, name, value);
  const count = form.elements.namedItem("rows");
  count.value = String(Math.max(Number(count.value), most + 1));
  add(form, "do", "show");
  form.submit();
  return true;
}

function add(form, name, value) {
  const field = document.createElement("input");
  field.type = "hidden";
  field.name = name;
  field.value = value;
  form.append(field);
}

function tell(form, place) {
  const note = document.getElementById("restored");
  note.hidden = false;
  note.querySelector("button").addEventListener("click", () => {
    forget(place);
    form.reset();
    note.hidden = true;
    void workOut(form);
  });
  void workOut(form);
}

async function workOut(form) {
  const body = new URLSearchParams(new FormData(form));
  body.set("do", "show");
  try {
    const answer = await fetch(form.action, { method: "POST", body, credentials: "same-origin" });
    if (!answer.ok) return;
    const page = new DOMParser().parseFromString(await answer.text(), "text/html");
    for (const id of ["outcome", "problem-says"]) {
      const [old, fresh] = [document.getElementById(id), page.getElementById(id)];
      if (old && fresh) old.replaceChildren(...fresh.childNodes);
    }
    for (const output of form.querySelectorAll("output[id]")) {
      output.textContent = page.getElementById(output.id)?.textContent ?? "";
    }
  } catch {
    // without a server the readings stay in the form; “Work it out” tells what is wrong
  }
}
