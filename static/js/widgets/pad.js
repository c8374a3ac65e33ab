// The number pad: keys act when the finger lifts, and never take the focus from the row.

import { el } from "./dom.js";

const KEYS = ["7", "8", "9", "4", "5", "6", "1", "2", "3", ".", "0", "back"];

/** The pad with its Write key; `signed` adds the key that turns the sign. */
export function padOf({ signed, label, onKey }) {
  const keys = KEYS.map((key) => keyOf(key, onKey));
  if (signed) keys.push(keyOf("±", onKey));
  const write = el("button", { type: "submit", form: "lit", class: "write", id: "write" }, label);
  const pad = el("div", { class: `pad${signed ? " is-signed" : ""}`, role: "group", "aria-label": "Number pad" }, keys, write);
  pad.addEventListener("pointerdown", (event) => event.preventDefault());
  pad.addEventListener("mousedown", (event) => event.preventDefault());
  return pad;
}

function keyOf(key, onKey) {
  const names = { back: "Delete the last digit", ".": "Decimal point", "±": "Change the sign" };
  return el(
    "button",
    { type: "button", "data-pad": key, "aria-label": names[key] ?? false, on: { click: () => onKey(key) } },
    key === "back" ? "⌫" : key,
  );
}
