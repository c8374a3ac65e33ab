// A run while it is done: what it comes to is shown after each row, and what is typed outlives a reload.
import { restore, keep, forget } from "../widgets/draft.js";

const form = document.querySelector("form[data-run]");
if (form) watch(form);

function watch(form) {
  const place = `run ${form.dataset.run}`;
  // only a form that was not sent yet: after a refusal the server's answer holds what was typed
  if (!form.querySelector("[name^=w][value]:not([value='']), [name^=m][name$=up]:not([value=''])")) restore(form, place);
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
