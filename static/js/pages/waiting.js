// The list of sheets: says where entries wait on this tablet, so that nobody forgets them there.

import { entries } from "../lib/strip.js";
import { sheetsWaiting } from "../outbox/store.js";
import { el } from "../widgets/dom.js";

function keeper() {
  try {
    return window.localStorage;
  } catch {
    return null;
  }
}

for (const list of document.querySelectorAll(".sheets")) {
  for (const { sheet, count } of sheetsWaiting(keeper(), list.dataset.person)) {
    const card = list.querySelector(`[data-sheet="${CSS.escape(sheet)}"]`);
    const says = `${entries(count)} ${count === 1 ? "waits" : "wait"} on this tablet. Open the sheet to send.`;
    card?.append(el("span", { class: "card-waits" }, says));
  }
}
