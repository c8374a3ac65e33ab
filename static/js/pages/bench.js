// The bench page: one sheet, drawn from its JSON, written row by row.

import { sentOf } from "../lib/curve.js";
import { clockOf, newEntry } from "../lib/entry.js";
import { COUNTS_AGAIN, METHOD_SLOT, keyOf, layOver, nextOf, rowsOf } from "../lib/overlay.js";
import { press } from "../lib/pad.js";
import { questionFor } from "../lib/questions.js";
import { readReason, readTyped, readWords, unitOf } from "../lib/reading.js";
import { entries, networkSays } from "../lib/strip.js";
import { Sender } from "../outbox/sender.js";
import { Store } from "../outbox/store.js";
import { CurveDesk } from "../outbox/curve_desk.js";
import { el } from "../widgets/dom.js";
import { echoOf } from "../widgets/lit.js";
import { padOf } from "../widgets/pad.js";
import { sheetOf } from "../widgets/rows.js";
import { cardOf, lineOf } from "../widgets/strip.js";

const LOOK_AGAIN_MS = 20000;
const READ_AGAIN = "read again, confirmed";

const place = document.getElementById("bench");
const { sheet: sheetId, person, initials } = place.dataset;
const spot = (name) => document.getElementById(name);

let sheet = JSON.parse(spot("sheet").textContent);
const store = new Store({ storage: keeper(), person, sheet: sheetId });
const sender = new Sender({
  store,
  person,
  door: `/api/sheets/${sheetId}/entries`,
  fetcher: (...given) => fetch(...given),
  onChange: taken,
});

/** What only this page knows: which row a person chose, what is asked, why a value is struck. */
const here = { chosen: null, note: null, reason: "", excluding: null, stripOpen: false, confirmed: null };
const desk = new CurveDesk({
  store,
  address: `/api/sheets/${sheetId}/curves/preview`,
  person,
  fetcher: (...given) => fetch(...given),
  onChange: (words) => {
    draw();
    showLit();
    if (words) say(words);
  },
});

function keeper() {
  try {
    return window.localStorage;
  } catch {
    return null;
  }
}

function newId() {
  if (crypto.randomUUID) return crypto.randomUUID();
  const bytes = crypto.getRandomValues(new Uint8Array(16));
  bytes[6] = (bytes[6] & 0x0f) | 0x40;
  bytes[8] = (bytes[8] & 0x3f) | 0x80;
  const hex = [...bytes].map((byte) => byte.toString(16).padStart(2, "0")).join("");
  return hex.replace(/^(.{8})(.{4})(.{4})(.{4})(.{12})$/, "$1-$2-$3-$4-$5");
}

function viewNow() {
  const kept = store.all();
  const groups = layOver(sheet, kept, store.opened());
  const waiting = kept.filter((entry) => entry.state === "waiting").length;
  const mayWrite = sheet.may_write;
  const rows = rowsOf(groups);
  const chosen = rows.find((row) => keyOf(row) === here.chosen);
  const lit = mayWrite ? (chosen ?? nextOf(groups, sheet, waiting)) : null;
  return {
    groups, rows, lit, mayWrite, waiting,
    typed: lit && lit.kind !== "curve" ? typedIn(lit) : "",
    curve: lit?.kind === "curve" ? desk.of(lit) : null,
    curveUrl: (row) => `/sheets/${sheetId}/curves/${row.replicate}`,
    note: here.note ?? (lit?.refused ? { says: wordsOf(lit.refused.problem) } : null),
    reasons: sheet.correction_reasons,
    reason: here.reason,
    excluding: here.excluding,
  };
}

function typedIn(row) {
  return store.drafts()[keyOf(row)] ?? row.refused?.text ?? "";
}

function wordsOf(problem) {
  const example = problem.example ? ` For example ${problem.example}.` : "";
  return `${problem.detail ?? problem.title ?? "This was not taken."}${example}`;
}

let view = viewNow();

function draw({ focus = false } = {}) {
  const field = document.activeElement?.id;
  const caret = field === "reading" ? [document.activeElement.selectionStart, document.activeElement.selectionEnd] : null;
  view = viewNow();
  spot("rows").replaceChildren(...sheetOf(view, acts));
  drawAside();
  drawEnd();
  const fine = window.matchMedia("(pointer: fine)").matches;
  if (focus && here.note?.answers?.length) document.querySelector("[data-answer]")?.focus();
  else if (focus && fine) (spot("reading") ?? spot("hand-in"))?.focus({ preventScroll: true });
  else if (field) spot(field)?.focus({ preventScroll: true });
  if (caret && document.activeElement?.id === "reading" && spot("reading").setSelectionRange) {
    spot("reading").setSelectionRange(...caret);
  }
}

function drawAside() {
  const network = { waiting: view.waiting, refused: store.refused().length, state: sender.state, detail: sender.detail, stored: store.isSafe() };
  const onToggle = (open) => (here.stripOpen = open);
  spot("strip").replaceChildren(
    cardOf(sheet.margin, network),
    lineOf(sheet.margin, network, { open: here.stripOpen, onToggle }),
  );
  const numbers = view.lit?.kind === "number";
  const words = view.lit && (view.lit.kind === "text" || (view.lit.kind === "curve" && view.curve.state === "shown"));
  const pad = numbers
    ? padOf({ signed: view.lit.signed, label: writeLabel(), onKey: padKey })
    : words
      ? el("div", { class: "pad only-write" }, el("button", { type: "submit", form: "lit", class: "write", id: "write" }, writeLabel()))
      : "";
  spot("pad").replaceChildren(pad);
}

function writeLabel() {
  const { lit, typed } = view;
  if (lit.kind !== "number") return [lit.value ? "Strike the old one and write" : lit.kind === "curve" ? "Write this curve" : "Write"];
  const what = [typed.trim(), typed.trim() ? unitOf(lit) : ""].filter(Boolean).join(" ");
  const verb = lit.value ? `Strike ${lit.value.text}, write` : "Write";
  return [el("span", { class: "verb" }, verb), " ", el("span", { class: "what" }, what)];
}

/** The foot of the sheet: on to hand in, or what keeps it from that. */
function drawEnd() {
  const missing = sheet.missing.map((says) => el("li", {}, says));
  const unsent = view.waiting + store.refused().length;
  const ready = sheet.may_hand_in && unsent === 0;
  const end = spot("end");
  if (!sheet.may_write && !sheet.may_hand_in) return end.replaceChildren();
  return end.replaceChildren(
    ready
      ? el("a", { class: "button main", id: "hand-in", href: `/bench/${sheetId}/hand-in` }, "Read it over and hand in")
      : el("p", { class: "soft" }, unsent > 0 ? `Hand in opens when ${entries(unsent)} more ${unsent === 1 ? "is" : "are"} on the server.` : "Before hand in:"),
    ready ? "" : el("ul", { class: "missing" }, missing),
  );
}

function say(words) {
  spot("said").textContent = words;
}

/** A value as it is said aloud; words are too long for that. */
function spoken(row, text) {
  return row.kind === "text" || row.kind === "curve" ? "" : `${text} ${unitOf(row)}`.trim();
}

/** The lit row whole between the top and the pad; a row taller than that shows its beginning. */
function showLit() {
  const row = document.querySelector(".row.next") ?? spot("hand-in");
  if (!row) return;
  const room = (place.clientHeight < place.scrollHeight ? place.clientHeight : window.innerHeight) - dock();
  row.scrollIntoView({ block: row.offsetHeight > room - 32 ? "start" : "center" });
}

/** The height of strip and pad where they are docked at the foot; told to the style sheet. */
function dock() {
  const side = spot("pad").parentElement.getBoundingClientRect();
  const height = side.width >= document.documentElement.clientWidth ? Math.ceil(side.height) : 0;
  document.documentElement.style.setProperty("--dock", `${height}px`);
  return height;
}

function taken(newSheet) {
  if (newSheet) {
    sheet = newSheet;
    if (store.waiting().length === 0) say("All entries are on the server.");
  } else if (sender.state === "offline") {
    say(networkSays({ waiting: store.waiting().length, refused: 0, state: "offline", stored: store.isSafe() }));
  }
  const before = view.lit && keyOf(view.lit);
  draw();
  if (view.lit && keyOf(view.lit) !== before) showLit();
  if (newSheet && !view.lit && document.activeElement === document.body) {
    spot("hand-in")?.focus({ preventScroll: true });
    showLit();
  }
  const odd = store.refused()[0];
  if (odd) say(`Not taken: ${wordsOf(odd.problem)}`);
}

const acts = {
  light(row) {
    Object.assign(here, { chosen: keyOf(row), note: null, reason: "", confirmed: null });
    draw({ focus: true });
    showLit();
    say(`${row.label}: ${row.value ? ["correcting", spoken(row, row.value.text)].filter(Boolean).join(" ") : "next"}.`);
  },
  leave() {
    if (view.lit?.refused) store.drop(view.lit.refused.id);
    desk.forget(view.lit);
    store.draft(here.chosen, "");
    Object.assign(here, { chosen: null, note: null, reason: "" });
    draw({ focus: true });
    showLit();
  },
  type(text) {
    const noted = here.note !== null || view.lit.refused;
    Object.assign(here, { note: null, confirmed: null });
    store.draft(keyOf(view.lit), text);
    if (view.lit.refused) store.drop(view.lit.refused.id);
    if (noted) draw();
    view.typed = text;
    if (spot("echo")) spot("echo").textContent = echoOf(view.lit, text);
    if (spot("write")) spot("write").replaceChildren(...writeLabel());
  },
  reason(text) {
    here.reason = text;
    if (here.note) acts.type(view.typed);
  },
  choose(text) {
    const { lit } = view;
    if (lit.slot !== METHOD_SLOT) return put(lit, { text, unit: null, raw: null }, null);
    const why = readReason(here.reason, "Say first why another method is taken, then choose it.");
    return why.says ? ask(why) : put(lit, { text, unit: null, raw: null }, why.text);
  },
  write() {
    const { lit, typed, rows } = view;
    if (lit.kind === "curve") return writeCurve();
    if (lit.kind === "text") {
      const words = readWords(typed, lit);
      return words.says ? ask(words) : put(lit, words, null);
    }
    const reading = readTyped(typed, lit);
    if (reading.says) return ask(reading);
    const question = here.confirmed === typed ? null : questionFor(lit, reading, rows);
    return question ? ask(question) : put(lit, reading, here.confirmed === typed ? READ_AGAIN : null);
  },
  answer(key) {
    if (key === "anyway") {
      here.confirmed = view.typed;
      here.note = null;
      return acts.write();
    }
    if (key === "segment") return refill();
    Object.assign(here, { note: null, confirmed: null });
    store.draft(keyOf(view.lit), "");
    return draw({ focus: true });
  },
  drop(row) {
    store.drop(row.refused.id);
    draw({ focus: true });
    say(`${row.label}: ${row.value.text} stands.`);
  },
  insist(row) {
    if (row.refused.curve) desk.take(row, row.refused.curve);
    else store.draft(keyOf(row), row.refused.text);
    store.drop(row.refused.id);
    acts.light(row);
  },
  exclude(replicate) {
    here.excluding = replicate;
    draw();
    (spot("criterion-0") ?? spot("why"))?.focus();
  },
  excludeForm,
  curve: {
    file: (file) => desk.file(view.lit, file),
    text: (text) => desk.typing(view.lit, text),
    pasted: () => setTimeout(() => desk.text(view.lit, spot("reading")?.value ?? "")),
    lookAtText: () => desk.text(view.lit, spot("reading")?.value ?? ""),
    look: () => desk.look(view.lit),
    change: (more) => desk.change(view.lit, more),
    unfinished: (roles, says) => say(says),
    forget: () => {
      desk.forget(view.lit);
      draw({ focus: true });
      showLit();
    },
  },
};

/** The curve that was shown goes to its row, to be read again in just the same way. */
function writeCurve() {
  const { lit, curve } = view;
  if (curve.state !== "shown") return ask({ says: "Choose the curve first: drop its file or paste two columns." });
  const sent = sentOf({ ...curve.chosen, mapping: curve.preview.mapping });
  const twice = curve.preview.same_as === null ? null : "the same file as another replicate, confirmed";
  return put(lit, { text: curve.preview.text, curve: sent }, twice);
}

function ask(note) {
  here.note = note;
  draw({ focus: true });
  showLit();
  say(note.says);
}

/** The reading before the refill is still to come; what was typed waits in the new segment's end. */
function refill() {
  const { lit, typed } = view;
  store.open(lit.replicate, lit.segment + 1);
  store.draft(keyOf(lit), "");
  store.draft(keyOf({ ...lit, segment: lit.segment + 1 }), typed);
  Object.assign(here, { note: null, chosen: keyOf(lit) });
  draw({ focus: true });
  showLit();
  say(`A segment was added. ${lit.label}: type the reading before the refill. ${typed.trim()} waits in the new segment.`);
}

function put(row, reading, confirmed) {
  const strikes = row.value?.id ?? null;
  const struckFor = readReason(here.reason, "Say why the old value is struck through: choose a reason or write one.");
  if (strikes && struckFor.says) return ask(struckFor);
  if (row.refused) store.drop(row.refused.id);
  keepAndSend(row, reading, { strikes, reason: strikes ? struckFor.text : confirmed });
  if (row.kind === "curve") desk.forget(row);
  store.draft(keyOf(row), "");
  Object.assign(here, { chosen: null, note: null, reason: "", confirmed: null });
  draw({ focus: true });
  showLit();
  const what = [row.label, spoken(row, reading.text)].filter(Boolean).join(" ");
  say(`${what} written on this tablet. ${view.lit ? `Next: ${view.lit.label}.` : ""}`);
  return undefined;
}

function keepAndSend(row, reading, { strikes, reason }) {
  const now = new Date();
  const stamp = {
    id: newId(),
    device_id: store.device(newId),
    device_sequence: store.sequence(),
    device_at: now.toISOString(),
    device_zone: Intl.DateTimeFormat().resolvedOptions().timeZone,
    monotonic_ms: Math.round(performance.now()),
    base_revision: sheet.revision,
    clock: clockOf(now),
  };
  store.keep(newEntry(row, reading, { strikes, reason, initials, stamp }));
  sender.flush();
}

function criteriaOf(row) {
  const names = row.choices.filter((choice) => choice !== COUNTS_AGAIN);
  return names.map((name, nth) =>
    el(
      "label",
      { class: "chip" },
      el("input", { type: "radio", name: "criterion", id: `criterion-${nth}`, value: name, required: true }),
      name,
    ),
  );
}

/** Asks for criterion and reason before a replicate is left out, or for the reason it counts again. */
function excludeForm(group, row) {
  const number = group.replicate;
  const question = group.excluded
    ? `Let replicate ${number} count again?`
    : `Leave replicate ${number} out of the mean: by which criterion?`;
  const submit = (event) => {
    event.preventDefault();
    const given = new FormData(event.target);
    const text = group.excluded ? COUNTS_AGAIN : given.get("criterion");
    const why = readReason(String(given.get("why") ?? ""), "Choose a criterion and say what happened.");
    if (!text || why.says) return say(why.says ?? "Choose a criterion.");
    here.excluding = null;
    if (row.refused) store.drop(row.refused.id);
    keepAndSend(row, { text }, { strikes: row.value?.id ?? null, reason: why.text });
    draw({ focus: true });
    return say(group.excluded ? `Replicate ${number} counts again.` : `Replicate ${number} is left out of the mean. It stays on the sheet.`);
  };
  const back = () => {
    here.excluding = null;
    draw();
  };
  return el(
    "form",
    { class: "leave-out", on: { submit } },
    el(
      "fieldset",
      { class: "reasons" },
      el("legend", {}, question),
      group.excluded ? null : el("div", { class: "chips" }, criteriaOf(row)),
      el("label", { for: "why" }, group.excluded ? "Why" : "What happened"),
      el("input", { id: "why", name: "why", type: "text", autocomplete: "off", required: true }),
    ),
    el(
      "div",
      { class: "answers" },
      el("button", { type: "submit", class: "button main" }, group.excluded ? "Let it count" : "Leave it out"),
      el("button", { type: "button", class: "button", on: { click: back } }, "Leave it as it is"),
    ),
  );
}

function padKey(key) {
  const text = press(view.typed, key);
  const field = spot("reading");
  field.value = text;
  acts.type(text);
  document.querySelector(".row.next")?.scrollIntoView({ block: "nearest" });
}

/** Keys typed with nothing in focus belong to the lit row: a balance that types, a keyboard aside. */
function looseKey(event) {
  const free = document.activeElement === document.body || document.activeElement === null;
  if (!free || event.ctrlKey || event.metaKey || event.altKey || view.lit?.kind !== "number") return;
  if (event.key === "Enter") acts.write();
  else if (event.key === "Backspace") padKey("back");
  else if (event.key.length === 1) {
    const text = view.typed + event.key;
    spot("reading").value = text;
    acts.type(text);
  } else return;
  event.preventDefault();
}

document.addEventListener("keydown", looseKey);
document.addEventListener("keydown", (event) => {
  if (event.key === "Escape" && (here.chosen || here.note)) acts.leave();
});
window.addEventListener("online", () => {
  sender.flush();
  if (view.lit?.kind === "curve" && view.curve.state === "offline") desk.look(view.lit);
});
for (const event of ["dragover", "drop"]) {
  document.addEventListener(event, (moved) => {
    if (view.lit?.kind !== "curve" || !moved.dataTransfer?.types?.includes("Files")) return;
    moved.preventDefault();
    if (event === "drop" && moved.dataTransfer.files[0]) desk.file(view.lit, moved.dataTransfer.files[0]);
  });
}
document.addEventListener("visibilitychange", () => document.hidden || sender.flush());
window.addEventListener("storage", () => draw());
setInterval(() => store.waiting().length > 0 && sender.flush(), LOOK_AGAIN_MS);

new ResizeObserver(dock).observe(spot("pad").parentElement);
place.classList.add("is-drawn");
draw({ focus: true });
showLit();
sender.flush();
