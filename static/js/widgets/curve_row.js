// The lit row of a curve: a file or pasted text, what was recognised, and the curve before it is written.

import { ROLES, mappingOf, remedyOf, rolesOf, withRole } from "../lib/curve.js";
import { el, svgOf, unseen } from "./dom.js";

const TAKES = ".csv,.tsv,.txt,.dat,.xlsx,text/csv,text/plain,text/tab-separated-values";

/** The field of a curve's row. `curve` is `{chosen, state, preview, problem}`, `acts` what can be done. */
export function curveField(row, curve, acts) {
  const shown = curve.state === "shown" && curve.preview;
  return el(
    "div",
    { class: "curve-row", id: "curve-row" },
    row.value ? el("s", { class: "struck" }, unseen("to be struck through: "), row.value.text) : null,
    curve.chosen ? chosenLine(curve, acts) : chooser(acts),
    curve.state === "reading" ? el("p", { class: "soft" }, "Reading …") : null,
    curve.problem ? problemOf(curve, acts) : null,
    shown ? previewOf(curve, acts) : null,
  );
}

function chooser(acts) {
  const file = el("input", {
    id: "curve-file",
    type: "file",
    class: "unseen",
    accept: TAKES,
    on: { change: (event) => event.target.files[0] && acts.file(event.target.files[0]) },
  });
  const paste = el("textarea", {
    id: "reading",
    class: "words curve-text",
    rows: "4",
    spellcheck: "false",
    autocomplete: "off",
    placeholder: "0.00\t4.01\n0.50\t4.03",
    "aria-describedby": "hint",
    on: { input: (event) => acts.text(event.target.value), paste: (event) => acts.pasted(event) },
  });
  return el(
    "div",
    { class: "curve-choose" },
    el("label", { class: "curve-drop", for: "curve-file" }, el("b", {}, "Drop the meter’s file here"), " or choose it: CSV, text or XLSX", file),
    el("div", { class: "curve-paste" }, el("label", { for: "reading" }, "Or paste two columns"), paste),
    el("button", { type: "button", class: "button", id: "curve-look", on: { click: () => acts.lookAtText() } }, "Look at it"),
  );
}

function chosenLine(curve, acts) {
  const name = curve.preview?.file_name ?? curve.chosen.file_name ?? "pasted text";
  const hash = curve.preview ? el("span", { class: "soft small" }, ` SHA-256 ${curve.preview.sha256.slice(0, 12)}…`) : null;
  return el(
    "p",
    { class: "curve-chosen" },
    el("b", {}, name),
    hash,
    " ",
    el("button", { type: "button", class: "button quiet", id: "curve-again", on: { click: () => acts.forget() } }, "Choose another"),
  );
}

function problemOf(curve, acts) {
  const { problem, chosen } = curve;
  const remedy = remedyOf(problem);
  const offline = curve.state === "offline";
  const answers = [];
  if (offline) answers.push(button("Try again", () => acts.look(), { id: "curve-retry" }));
  if (remedy.row !== null) answers.push(button(`Leave out row ${remedy.row}`, () => acts.change({ leave_out: [...(chosen.leave_out ?? []), remedy.row] }), { id: "curve-leave-out" }));
  return el(
    "div",
    { class: "ask", id: "curve-note" },
    el("p", {}, problem.detail, problem.example ? el("span", { class: "soft" }, ` For example ${problem.example}`) : null),
    answers.length ? el("div", { class: "answers" }, answers) : null,
    remedy.drop ? dropOf(chosen, acts) : null,
    remedy.sheet ? sheetOf(chosen, acts) : null,
    remedy.table && !remedy.drop ? tableOf(remedy, acts) : null,
  );
}

/** The columns as they stand; folded away where it is a row that is odd. */
function tableOf({ row, table, mapping }, acts) {
  const columns = columnsOf({
    width: table.width,
    header: table.header,
    rows: table.rows.map((one) => one.cells),
    roles: rolesOf(mapping, table.width),
    mark: table.rows.findIndex((one) => one.row === row),
  }, acts);
  return row === null ? columns : folded(columns);
}

function folded(columns) {
  return el("details", { class: "fold curve-columns" }, el("summary", {}, "The columns"), columns);
}

function previewOf(curve, acts) {
  const { preview, chosen } = curve;
  const width = preview.columns.length;
  const rows = preview.columns[0]?.cells.map((_, nth) => preview.columns.map((one) => one.cells[nth])) ?? [];
  const header = preview.columns.some((one) => one.name) ? preview.columns.map((one) => one.name) : null;
  const drops = preview.mapping.volume_unit === "drops";
  const last = preview.last[preview.last.length - 1];
  return el(
    "div",
    { class: "curve-preview" },
    el("p", { class: "curve-told", id: "curve-told" }, `${preview.points} points, ${preview.kind}${preview.timed ? ", with times" : ""}: from ${preview.first[0][0]} mL, ${preview.first[0][1]}, to ${last[0]} mL, ${last[1]}.`),
    el("ul", { class: "curve-says" }, preview.says.map((one) => el("li", {}, one))),
    preview.set_aside.map((one) => el("p", { class: "look", "data-aside": true }, one)),
    folded(columnsOf({ width, header, rows, roles: rolesOf(preview.mapping, width), mark: -1 }, acts)),
    drops ? dropOf(chosen, acts) : null,
    picturesOf(preview.curve),
    preview.same_as === null ? null : el("p", { class: "ask look", id: "curve-twice" }, `This file is the curve of replicate ${preview.same_as} already.`),
    el(
      "div",
      { class: "answers" },
      el("button", { type: "submit", class: "button main big", id: "curve-write" }, preview.same_as === null ? "Write this curve" : "It is the same all the same: write it"),
    ),
  );
}

/** The curve with every method's volume, as the sheet will show it. */
function picturesOf(curve) {
  if (!curve) return null;
  if (!curve.pictures.whole) return el("p", { class: "ask look" }, curve.problem ?? "");
  const able = curve.methods.filter((one) => one.volume);
  const unable = curve.methods.filter((one) => !one.volume);
  const line = (one) => el(
    "li",
    { class: one.taken ? "is-taken" : false },
    el("span", {}, svgOf(one.shape), " ", one.method, one.taken ? el("b", { class: "tag is-point" }, "taken") : null),
    el("span", { class: "digits" }, `${one.volume} mL`),
    el("span", { class: "digits soft" }, `u ${one.u}`),
  );
  return el(
    "div",
    { class: "curve-shown" },
    curve.problem ? el("p", { class: "ask look" }, curve.problem) : null,
    el("figure", { class: "curve-figure" }, el("div", { class: "chart-box" }, svgOf(curve.pictures.whole))),
    el("ul", { class: "curve-volumes", role: "list", id: "curve-volumes" }, able.map(line)),
    el("p", { class: "believe" }, curve.believe),
    unable.length ? el("p", { class: "soft small" }, `No volume by ${unable.map((one) => one.method).join(", ")}.`) : null,
  );
}

function columnsOf({ width, header, rows, roles, mark }, acts) {
  const select = (at) => {
    const choose = (event) => {
      const next = withRole(roles, at, event.target.value);
      roles.splice(0, roles.length, ...next);
      const mapping = mappingOf(roles);
      if (mapping.says) acts.unfinished(roles, mapping.says);
      else acts.change({ mapping });
    };
    const name = header?.[at] || `column ${at + 1}`;
    return el(
      "select",
      { "aria-label": `What ${name} holds`, id: `curve-column-${at}`, on: { change: choose } },
      ROLES.map(([value, words]) => el("option", { value, selected: roles[at] === value }, words)),
    );
  };
  const places = Array.from({ length: width }, (_, at) => at);
  return el(
    "div",
    { class: "curve-table", tabindex: "0" },
    el(
      "table",
      {},
      el("caption", { class: "unseen" }, "The first rows of the table"),
      el("thead", {}, el("tr", {}, places.map((at) => el("th", { scope: "col" }, header ? el("span", { class: "curve-header" }, header[at] || "") : null, select(at))))),
      el("tbody", {}, rows.map((cells, nth) => el("tr", { class: nth === mark ? "is-odd" : false }, places.map((at) => el("td", { class: "digits" }, cells[at] ?? ""))))),
    ),
  );
}

function dropOf(chosen, acts) {
  const volume = el("input", { id: "curve-drop", type: "text", inputmode: "decimal", autocomplete: "off", value: chosen.drop_mL ?? "" });
  const u = el("input", { id: "curve-drop-u", type: "text", inputmode: "decimal", autocomplete: "off", value: chosen.drop_u_mL ?? "" });
  const take = () => acts.change({ drop_mL: volume.value, drop_u_mL: u.value });
  return el(
    "fieldset",
    { class: "curve-drops" },
    el("legend", {}, "Drops were counted"),
    el("label", { for: "curve-drop" }, "Volume of one drop, mL"), volume,
    el("label", { for: "curve-drop-u" }, "its u, mL: the same for every drop"), u,
    button("Take it", take, { id: "curve-drop-take" }),
  );
}

function sheetOf(chosen, acts) {
  const name = el("input", { id: "curve-sheet", type: "text", autocomplete: "off", value: chosen.sheet ?? "" });
  return el(
    "div",
    { class: "curve-drops" },
    el("label", { for: "curve-sheet" }, "Sheet of the workbook"), name,
    button("Look there", () => acts.change({ sheet: name.value }), { id: "curve-sheet-take" }),
  );
}

function button(words, click, more = {}) {
  return el("button", { type: "button", class: "button", ...more, on: { click } }, words);
}
