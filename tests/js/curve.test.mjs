import assert from "node:assert/strict";
import test from "node:test";

import {
  MOST_BYTES, MOST_KEPT, ROLES, base64Of, chosenFile, chosenFrom, chosenText, forPreview, mappingOf, remedyOf, rolesOf, sentOf, tooLarge,
  withRole,
} from "../../static/js/lib/curve.js";
import { CurveDesk } from "../../static/js/outbox/curve_desk.js";
import { Store } from "../../static/js/outbox/store.js";
import { Storage } from "./sheets.mjs";

const ROW = { replicate: 3, slot: "curve", segment: 1, kind: "curve" };

function deskWith(answers, { storage = new Storage() } = {}) {
  const store = new Store({ storage: storage, person: "ida", sheet: "s1" });
  const [asked, said] = [[], []];
  const fetcher = async (address, given) => {
    asked.push({ address, body: JSON.parse(given.body) });
    const next = answers.shift();
    if (next instanceof Error) throw next;
    return { ok: next.status === 200, status: next.status, json: async () => next.body };
  };
  const desk = new CurveDesk({ store, address: "/preview", person: "ida", fetcher, onChange: (words) => said.push(words) });
  return { desk, store, asked, said };
}

const SHOWN = { status: 200, body: { text: "run3.csv, 61 points, pH", mapping: { volume: 0, reading: 1, kind: "pH" } } };

test("bytes become the base64 text that node makes of them", () => {
  for (const size of [0, 1, 2, 3, 4, 255, 256]) {
    const bytes = Uint8Array.from({ length: size }, (_, at) => (at * 37) % 256);
    assert.equal(base64Of(bytes), Buffer.from(bytes).toString("base64"));
  }
});

test("a kept draft is what was chosen, and any other text is text that was pasted", () => {
  const chosen = chosenFile("run3.csv", Uint8Array.from([49, 59, 50]));
  assert.deepEqual(chosenFrom(JSON.stringify(chosen)), chosen);
  assert.deepEqual(chosenFrom("0.00\t4.01"), chosenText("0.00\t4.01"));
  assert.deepEqual(chosenFrom("5"), chosenText("5"));
  assert.equal(chosenFrom(""), null);
});

test("the door gets only what it knows, with decimal points in the volume of a drop", () => {
  const chosen = { pasted: "1;2", mapping: null, sheet: "", drop_mL: " 0,0487 ", leave_out: [], other: 1 };
  assert.deepEqual(sentOf(chosen), { pasted: "1;2", drop_mL: "0.0487" });
  assert.deepEqual(forPreview({ pasted: "1;2", leave_out: [7] }, 3), { replicate: 3, pasted: "1;2", leave_out: [7] });
});

test("an empty file is sent and kept as one, so that the answer is about it", () => {
  const empty = chosenFile("empty.csv", new Uint8Array());
  assert.deepEqual(forPreview(empty, 2), { replicate: 2, file_name: "empty.csv", content_base64: "" });
  assert.deepEqual(chosenFrom(JSON.stringify(empty)), empty);
});

test("columns become roles and roles the same columns", () => {
  const mapping = { volume: 2, volume_unit: "drops", reading: 0, reading_unit: "mV", kind: "mV", time: 1, time_unit: "min" };
  const roles = rolesOf(mapping, 4);
  assert.deepEqual(roles, ["reading/mV", "time/min", "volume/drops", ""]);
  assert.deepEqual(mappingOf(roles), mapping);
  for (const role of roles) assert.ok(ROLES.some(([value]) => value === role), role);
});

test("a role stands in one column only", () => {
  const roles = withRole(["volume/mL", "reading/pH", ""], 2, "volume/µL");
  assert.deepEqual(roles, ["", "reading/pH", "volume/µL"]);
  assert.deepEqual(mappingOf(["", "reading/pH"]), { says: "Say which column is the volume." });
  assert.deepEqual(mappingOf(["volume/mL", ""]), { says: "Say which column is the pH or the mV." });
});

test("a refusal tells which row can be left out, and what else helps", () => {
  assert.equal(remedyOf({ field: "file", shown: { row: 12, column: 2 } }).row, 12);
  assert.equal(remedyOf({ field: "drop_mL" }).drop, true);
  assert.equal(remedyOf({ field: "sheet" }).sheet, true);
  assert.deepEqual(remedyOf({}), { row: null, table: null, mapping: null, drop: false, sheet: false });
});

test("a file that is too large is not sent", () => {
  assert.equal(tooLarge(MOST_BYTES), null);
  assert.match(tooLarge(5_100_000), /5\.1 MB; at most 5 MB/);
});

test("what was chosen is shown by the server, and kept until then", async () => {
  const { desk, store, asked } = deskWith([SHOWN]);
  await desk.take(ROW, chosenText("0;1"));
  assert.deepEqual(asked, [{ address: "/preview", body: { replicate: 3, pasted: "0;1" } }]);
  assert.equal(desk.of(ROW).state, "shown");
  assert.deepEqual(JSON.parse(store.drafts()["3/curve/1"]), { pasted: "0;1" });
  desk.forget(ROW);
  assert.deepEqual(store.drafts(), {});
  assert.equal(desk.of(ROW).state, "idle");
});

test("without a network nothing is lost: a reload finds what was chosen and looks again", async () => {
  const storage = new Storage();
  const first = deskWith([new Error("offline")], { storage });
  await first.desk.take(ROW, chosenText("0;1"));
  assert.equal(first.desk.of(ROW).state, "offline");
  assert.match(first.said.at(-1), /No network: .* kept on this tablet, nothing is lost/);
  const again = deskWith([SHOWN], { storage });
  assert.deepEqual(again.desk.of(ROW).chosen, { pasted: "0;1" });
  await new Promise((done) => setTimeout(done));
  assert.equal(again.desk.of(ROW).state, "shown");
});

test("a file too large for this tablet says so, and stays while the page is open", async () => {
  const { desk, store, said } = deskWith([new Error("offline")]);
  await desk.take(ROW, chosenText("x".repeat(MOST_KEPT)));
  assert.deepEqual(store.drafts(), {});
  assert.equal(desk.of(ROW).chosen.pasted.length, MOST_KEPT);
  assert.match(said.at(-1), /too large to be kept on this tablet/);
});

test("a refusal stands in the row with its remedy, and a change is looked at anew", async () => {
  const problem = { detail: "Row 12, column 2: “err” is not a number.", field: "file", shown: { row: 12, column: 2 } };
  const { desk, asked } = deskWith([{ status: 422, body: problem }, SHOWN]);
  await desk.take(ROW, chosenText("0;1"));
  assert.deepEqual([desk.of(ROW).state, desk.of(ROW).problem.detail], ["refused", problem.detail]);
  await desk.change(ROW, { leave_out: [12] });
  assert.deepEqual(asked[1].body, { replicate: 3, pasted: "0;1", leave_out: [12] });
  assert.equal(desk.of(ROW).state, "shown");
});

test("who is signed out is told so, and the choice is kept", async () => {
  const { desk, said } = deskWith([{ status: 401, body: { detail: "Sign in first." } }]);
  await desk.take(ROW, chosenText("0;1"));
  assert.match(said.at(-1), /You are signed out\. .* Sign in again/);
});

test("an answer that comes late does not overwrite a newer choice", async () => {
  const { desk } = deskWith([SHOWN, { status: 422, body: { detail: "no" } }]);
  const first = desk.take(ROW, chosenText("0;1"));
  const second = desk.take(ROW, chosenText("0;2"));
  await Promise.all([first, second]);
  assert.deepEqual([desk.of(ROW).chosen.pasted, desk.of(ROW).state], ["0;2", "refused"]);
});
