// The rows of the sheet: written, lit, or still to come.

import { SERVER, keyOf } from "../lib/overlay.js";
import { unitOf } from "../lib/reading.js";
import { litRow } from "./lit.js";
import { el, unseen } from "./dom.js";

/** The whole ruled page. `view` is what stands, `acts` what a person can do. */
export function sheetOf(view, acts) {
  return view.groups.map((group) => groupOf(group, view, acts));
}

function groupOf(group, view, acts) {
  const name = `group-${group.replicate}`;
  const heading = el("h3", { id: name, class: "group-name" }, numeral(group));
  const drawn = group.rows.filter((row) => row.slot !== "excluded");
  const rows = drawn.map((row) => rowOf(row, view, acts));
  const marks = [excludedNote(group), leaveOut(group, view, acts)].filter(Boolean);
  return el(
    "section",
    { class: `group${group.excluded ? " is-excluded" : ""}`, "aria-labelledby": name },
    heading,
    el("div", { class: "group-body" }, el("ol", { class: "rows", role: "list" }, rows), marks),
  );
}

function numeral(group) {
  if (group.replicate === 0) return [el("span", { class: "group-title" }, group.title)];
  return [unseen("Replicate "), el("span", { class: "numeral" }, String(group.replicate))];
}

function rowOf(row, view, acts) {
  const lit = view.lit && keyOf(view.lit) === keyOf(row);
  if (lit) {
    const line = litRow(row, view, acts);
    line.append(...remarksOf(row));
    return line;
  }
  return row.value ? writtenRow(row, view, acts) : emptyRow(row, view, acts);
}

function wordy(row) {
  if (row.kind === "text") return " is-words is-text";
  return row.kind === "choice" || row.kind === "curve" ? " is-words" : "";
}

function writtenRow(row, view, acts) {
  const says = [row.value.text, unitOf(row)].filter(Boolean).join(" ");
  const shown = el("span", { class: row.kind === "number" ? "reading" : "reading words" }, row.value.text);
  const value = view.mayWrite
    ? el(
        "button",
        {
          type: "button",
          class: "value",
          "data-key": keyOf(row),
          "aria-label": `${row.label}, ${says}. Correct it`,
          on: { click: () => acts.light(row) },
        },
        shown,
      )
    : el("span", { class: "value" }, shown);
  return el(
    "li",
    { class: `row written${wordy(row)}`, "data-key": keyOf(row) },
    el("span", { class: "label" }, row.label),
    el("span", { class: "values" }, struckOf(row), value),
    el("span", { class: "unit" }, unitOf(row)),
    whereOf(row),
    row.struck.map(reasonOf),
    remarksOf(row),
    row.refused ? bothOf(row, view, acts) : null,
    row.kind === "curve" ? curveLinks(row, view) : null,
  );
}

/** Where a curve that is on the server can be looked at alone, and its original fetched. */
function curveLinks(row, view) {
  if (row.where !== SERVER) return null;
  return el(
    "p",
    { class: "row-note curve-links" },
    el("a", { href: view.curveUrl(row) }, "The curve"),
    row.value.file_url ? el("a", { href: row.value.file_url, download: true }, "Its original file") : null,
  );
}

/** Somebody else was first in this row: both values, and what can be done. */
function bothOf(row, view, acts) {
  const says = `Yours, ${row.refused.text}, was not taken: ${row.refused.problem.detail ?? ""}`;
  const keep = el("button", { type: "button", class: "button", on: { click: () => acts.drop(row) } }, `Keep ${row.value.text}`);
  const strike = el("button", { type: "button", class: "button main", on: { click: () => acts.insist(row) } }, `Strike ${row.value.text}, write ${row.refused.text}`);
  return el(
    "div",
    { class: "ask" },
    el("p", { class: "fails" }, says),
    view.mayWrite ? el("div", { class: "answers" }, keep, strike) : null,
  );
}

function emptyRow(row, view, acts) {
  const dot = el("span", { "aria-hidden": "true" }, "·");
  const spot = view.mayWrite
    ? el(
        "button",
        {
          type: "button",
          class: "value",
          "data-key": keyOf(row),
          "aria-label": `Write ${row.label} now`,
          on: { click: () => acts.light(row) },
        },
        row.refused ? row.refused.text : dot,
      )
    : el("span", { class: "value" }, dot, unseen("not written"));
  const state = row.refused ? "not taken" : row.required ? "" : "if needed";
  return el(
    "li",
    { class: `row later${wordy(row)}${row.refused ? " is-refused" : ""}`, "data-key": keyOf(row) },
    el("span", { class: "label" }, row.label),
    el("span", { class: "values" }, struckOf(row), spot),
    el("span", { class: "unit" }, unitOf(row)),
    el("span", { class: "where" }, state),
    row.refused ? el("p", { class: "row-note fails" }, row.refused.problem.detail ?? "Not taken.") : null,
    remarksOf(row),
  );
}

/** What a countersigner said about this row when the sheet was sent back. */
export function remarksOf(row) {
  return (row.remarks ?? []).map((one) =>
    el("p", { class: "row-note row-remark" }, el("b", {}, `Sent back, ${one.by}, ${one.says_at}: `), one.text),
  );
}

/** The values struck through, still readable. */
export function struckOf(row) {
  return row.struck.map((one) => el("s", { class: "struck" }, unseen("struck through: "), one.entry.text));
}

function reasonOf(one) {
  const words = `${one.entry.text} struck through by ${one.struck_by} ${one.struck_clock}: ${one.reason}`;
  return el("p", { class: "row-note" }, words);
}

function whereOf(row) {
  const { initials, clock, late, reason } = row.value;
  const kept = row.where === SERVER;
  return el(
    "span",
    { class: `where ${kept ? "is-server" : "is-tablet"}` },
    el("span", { class: "by" }, `${initials} ${clock}`),
    el("span", { class: "kept" }, el("span", { class: "kept-mark", "aria-hidden": "true" }), row.where),
    late ? el("span", { class: "late" }, "late entry") : null,
    reason && row.struck.length === 0 ? el("span", { class: "why" }, reason) : null,
  );
}

function excludedNote(group) {
  const row = group.rows.find((one) => one.slot === "excluded");
  const refused = row?.refused
    ? el("p", { class: "row-note fails" }, `${row.refused.text}: ${row.refused.problem.detail ?? "not taken."}`)
    : null;
  if (!group.excluded) return refused;
  const where = group.excludedWhere === SERVER ? "" : ` (${group.excludedWhere})`;
  const note = el("p", { class: "group-note" }, el("b", {}, "Left out of the mean. "), group.excluded, where);
  return refused ? el("div", {}, note, refused) : note;
}

function leaveOut(group, view, acts) {
  const row = group.rows.find((one) => one.slot === "excluded");
  const begun = group.rows.some((one) => one.value);
  if (!view.mayWrite || !row || !begun) return null;
  if (view.excluding === group.replicate) return acts.excludeForm(group, row);
  const press = { click: () => acts.exclude(group.replicate) };
  const label = group.excluded
    ? `Let replicate ${group.replicate} count again`
    : `Leave replicate ${group.replicate} out of the mean`;
  const words = group.excluded ? "Let it count again…" : "Leave out…";
  return el("button", { type: "button", class: "quiet", "aria-label": label, on: press }, words);
}
