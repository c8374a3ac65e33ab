// What was typed before a signature, kept on this device for the person who typed it: a session that
// ended in the middle, or a battery, loses none of it. Passwords, names and ticks are never kept.

import { keep, restore } from "../widgets/draft.js";

const PATIENCE_MS = 400;

for (const form of document.querySelectorAll("form[data-draft]")) {
  const place = `draft:${form.dataset.draft}`;
  // what the server shows again after a refusal is newer than the draft
  if (form.dataset.typed === undefined) {
    const { changed } = restore(form, place);
    if (changed) tell(form);
  }
  openWritten(form);
  list(form);
  let waiting = 0;
  for (const field of form.elements) {
    field.addEventListener("input", () => {
      list(form);
      clearTimeout(waiting);
      waiting = setTimeout(() => keep(form, place), PATIENCE_MS);
    });
  }
  form.addEventListener("submit", () => keep(form, place));
}

function tell(form) {
  const says = document.createElement("p");
  says.className = "note draft-note";
  says.setAttribute("role", "status");
  says.textContent = "What you typed here before is back. Nothing of it was sent.";
  form.prepend(says);
}

/** Remarks that stand at rows are seen: their folds open. */
function openWritten(form) {
  for (const field of rowFields(form)) if (field.value.trim()) field.closest("details").open = true;
}

/** The form says which rows have a remark, and leads there. */
function list(form) {
  const rows = form.querySelector("#row-remarks");
  if (!rows) return;
  const written = rowFields(form).filter((field) => field.value.trim());
  rows.hidden = written.length === 0;
  rows.replaceChildren(
    ...written.map((field) => {
      const line = document.createElement("li");
      const where = document.createElement("a");
      where.href = `#${field.closest("li").id}`;
      where.textContent = field.dataset.where;
      line.append(where, ` ${field.value.trim()}`);
      return line;
    }),
  );
}

function rowFields(form) {
  return [...form.elements].filter((field) => field.dataset.where);
}
