// The lit row: the one that is written next, or the one that is being corrected.

import { echo, readTyped, unitOf } from "../lib/reading.js";
import { METHOD_SLOT, keyOf } from "../lib/overlay.js";
import { curveField } from "./curve_row.js";
import { el, unseen } from "./dom.js";

/** The lit row as a form of its own; the pad's Write key belongs to it. */
export function litRow(row, view, acts) {
  const correcting = row.value !== null;
  const key = keyOf(row);
  const form = el(
    "form",
    { class: row.kind === "curve" ? "lit is-curve" : "lit", id: "lit", novalidate: true, on: { submit: (event) => (event.preventDefault(), acts.write()) } },
    el(
      "div",
      { class: "label" },
      labelOf(row),
      row.hint ? el("span", { class: "hint", id: "hint" }, row.hint) : null,
    ),
    fieldOf(row, view, acts),
    el("span", { class: "unit", "aria-hidden": "true" }, unitOf(row)),
    el("span", { class: "where" }, correcting ? "correcting" : "next"),
    row.kind === "number" ? el("p", { class: "echo", id: "echo" }, echoOf(row, view.typed)) : null,
    noteOf(row, view, acts),
    correcting ? reasonsOf(row, view, acts) : row.slot === METHOD_SLOT ? whyOf(view, acts) : null,
  );
  return el("li", { class: "row next", "data-key": key, "aria-current": "step" }, form);
}

/** A label names its field; a button is named by what it says. */
function labelOf(row) {
  const typed = row.kind === "number" || row.kind === "text";
  if (!typed) return el("span", {}, row.label);
  return el("label", { for: "reading" }, row.label, row.unit ? unseen(`, in ${unitOf(row)}`) : null);
}

/** What the typed text amounts to, said back while it is typed. */
export function echoOf(row, typed) {
  if (!typed.trim()) return "";
  const reading = readTyped(typed, row);
  return reading.says ? "" : echo(reading.text, unitOf(row));
}

function fieldOf(row, view, acts) {
  if (row.kind === "curve") return curveField(row, view.curve, acts.curve);
  if (row.kind === "step") return stepButton(row, acts);
  if (row.kind === "choice") return choices(row, acts);
  const described = { "aria-describedby": "hint echo note", "aria-invalid": view.note ? "true" : false };
  const input = (event) => acts.type(event.target.value);
  return el(
    "span",
    { class: "values" },
    row.value ? el("s", { class: "struck" }, unseen("to be struck through: "), row.value.text) : null,
    row.kind === "text" ? wordsOf(view, acts, described, input) : numberOf(row, view, described, input),
  );
}

function numberOf(row, view, described, input) {
  return el("input", {
    id: "reading",
    class: "reading",
    type: "text",
    inputmode: row.signed ? "text" : "decimal",
    autocomplete: "off",
    autocapitalize: "off",
    spellcheck: "false",
    enterkeyhint: "next",
    value: view.typed,
    ...described,
    on: { input },
  });
}

/** Enter writes here too; Shift and Enter begin a new line. */
function wordsOf(view, acts, described, input) {
  const keydown = (event) => {
    if (event.key !== "Enter" || event.shiftKey || event.isComposing) return;
    event.preventDefault();
    acts.write();
  };
  const attributes = { id: "reading", class: "words", rows: "3", enterkeyhint: "next", ...described, on: { input, keydown } };
  return el("textarea", attributes, view.typed);
}

function stepButton(row, acts) {
  const press = (text) => ({ click: () => acts.choose(text) });
  const done = { type: "button", id: "reading", class: "button point", on: press("done") };
  const offered = (row.choices ?? []).map((text) =>
    el("button", { type: "button", class: "button", on: press(text) }, text),
  );
  const button = el("button", done, `Done: ${row.label}`);
  if (!offered.length) return button;
  return el("span", { class: "choices", role: "group", "aria-label": row.label }, [...offered, button]);
}

function choices(row, acts) {
  const buttons = row.choices.map((choice, place) =>
    el(
      "button",
      { type: "button", id: place === 0 ? "reading" : false, class: "button", on: { click: () => acts.choose(choice) } },
      choice,
    ),
  );
  return el("span", { class: "choices", role: "group", "aria-label": row.label }, buttons);
}

function noteOf(row, view, acts) {
  if (!view.note) return null;
  const answers = (view.note.answers ?? []).map((answer) =>
    el(
      "button",
      {
        type: "button",
        class: answer.key === "again" ? "button" : "button main",
        "data-answer": answer.key,
        on: { click: () => acts.answer(answer.key) },
      },
      answer.label,
    ),
  );
  return el(
    "div",
    { class: "ask", id: "note" },
    el("p", {}, view.note.says),
    answers.length ? el("div", { class: "answers" }, answers) : null,
  );
}

function reasonsOf(row, view, acts) {
  const chips = view.reasons.map((reason) =>
    el(
      "label",
      { class: "chip" },
      el("input", {
        type: "radio",
        name: "reason",
        value: reason,
        checked: view.reason === reason,
        on: { change: () => acts.reason(reason) },
      }),
      reason,
    ),
  );
  const own = view.reasons.includes(view.reason) ? "" : view.reason;
  return el(
    "fieldset",
    { class: "reasons" },
    el("legend", {}, "Why is it struck through?"),
    el("div", { class: "chips" }, chips),
    el("label", { class: "own", for: "own-reason" }, "In your own words"),
    el("input", {
      id: "own-reason",
      type: "text",
      autocomplete: "off",
      value: own,
      on: { input: (event) => acts.reason(event.target.value) },
    }),
    el("button", { type: "button", class: "button", on: { click: acts.leave } }, "Leave it as it is"),
  );
}

/** The reason that a choice needs although nothing is struck. */
function whyOf(view, acts) {
  const input = (event) => acts.reason(event.target.value);
  return el(
    "fieldset",
    { class: "reasons" },
    el("legend", {}, "Why is another method taken?"),
    el("label", { class: "own", for: "own-reason" }, "In your own words"),
    el("input", { id: "own-reason", type: "text", autocomplete: "off", value: view.reason, on: { input } }),
    el("button", { type: "button", class: "button", on: { click: acts.leave } }, "Leave it as it is"),
  );
}
