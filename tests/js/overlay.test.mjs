// The sheet as it stands on this tablet: unsent entries over the server's rows.

import assert from "node:assert/strict";
import test from "node:test";

import { COUNTS_AGAIN, SERVER, TABLET, keyOf, layOver, nextOf, rowsOf } from "../../static/js/lib/overlay.js";
import { entryOf, groupOf, rowOf, sheetOf, valueOf } from "./sheets.mjs";

const find = (groups, replicate, slot, segment = 1) =>
  rowsOf(groups).find((row) => keyOf(row) === `${replicate}/${slot}/${segment}`);

test("a row that the server wrote says so", () => {
  const sheet = sheetOf([groupOf(1, [rowOf("burette_start", { value: valueOf("a", "0.00") })])]);
  const row = find(layOver(sheet, [], []), 1, "burette_start");
  assert.equal(row.where, SERVER);
  assert.equal(row.value.text, "0.00");
});

test("an unsent entry stands over the server's empty row", () => {
  const sheet = sheetOf([groupOf(1, [rowOf("burette_start")])]);
  const row = find(layOver(sheet, [entryOf("a", "burette_start", "0.00")], []), 1, "burette_start");
  assert.equal(row.value.text, "0.00");
  assert.equal(row.value.initials, "IT");
  assert.equal(row.value.clock, "09:15");
  assert.equal(row.value.late, false);
  assert.equal(row.where, TABLET);
});

test("an entry that the server has already is not laid over twice", () => {
  const sheet = sheetOf([groupOf(1, [rowOf("burette_start", { value: valueOf("a", "0.00") })])]);
  const row = find(layOver(sheet, [entryOf("a", "burette_start", "0.00")], []), 1, "burette_start");
  assert.equal(row.where, SERVER);
});

test("an entry that was struck on the server does not come back", () => {
  const struck = { entry: valueOf("a", "0.00"), struck_by: "BO", struck_clock: "09:13", struck_at: "", reason: "misread" };
  const sheet = sheetOf([groupOf(1, [rowOf("burette_start", { value: valueOf("b", "0.02"), struck: [struck] })])]);
  const row = find(layOver(sheet, [entryOf("a", "burette_start", "0.00")], []), 1, "burette_start");
  assert.equal(row.value.text, "0.02");
});

test("an unsent correction strikes the server's value through and keeps it readable", () => {
  const sheet = sheetOf([groupOf(1, [rowOf("burette_end", { value: valueOf("a", "18.46") })])]);
  const correction = entryOf("b", "burette_end", "18.64", { strikes: "a", reason: "digits swapped" });
  const row = find(layOver(sheet, [correction], []), 1, "burette_end");
  assert.equal(row.value.text, "18.64");
  assert.equal(row.struck.length, 1);
  assert.equal(row.struck[0].entry.text, "18.46");
  assert.equal(row.struck[0].reason, "digits swapped");
  assert.deepEqual(sheet.groups[0].rows[0].struck, [], "the server's sheet is left as it came");
});

test("a refused entry leaves the row open with its text and the problem", () => {
  const sheet = sheetOf([groupOf(1, [rowOf("burette_end")])]);
  const refused = entryOf("a", "burette_end", "99.99", { state: "refused", problem: { detail: "More than the burette holds." } });
  const row = find(layOver(sheet, [refused], []), 1, "burette_end");
  assert.equal(row.value, null);
  assert.deepEqual(row.refused, { id: "a", text: "99.99", problem: { detail: "More than the burette holds." } });
});

test("a refused line shows the line as it came", () => {
  const sheet = sheetOf([groupOf(1, [rowOf("burette_end")])]);
  const refused = entryOf("a", "burette_end", "18.64", { raw: "N 18.64 mL", state: "refused", problem: {} });
  assert.equal(find(layOver(sheet, [refused], []), 1, "burette_end").refused.text, "N 18.64 mL");
});

test("an entry written after a refused one takes its place", () => {
  const sheet = sheetOf([groupOf(1, [rowOf("burette_end")])]);
  const kept = [
    entryOf("a", "burette_end", "99.99", { state: "refused", problem: {} }),
    entryOf("b", "burette_end", "18.64"),
  ];
  const row = find(layOver(sheet, kept, []), 1, "burette_end");
  assert.equal(row.value.text, "18.64");
  assert.equal(row.refused, null);
});

test("a filling opened here has its rows behind the first, under the server's own words", () => {
  const rows = [rowOf("burette_start", { label: "Burette, start" }), rowOf("burette_end", { label: "Burette, end" }), rowOf("temperature")];
  const groups = layOver(sheetOf([groupOf(1, rows)]), [], ["1/2"]);
  assert.deepEqual(
    groups[0].rows.map((row) => keyOf(row)),
    ["1/burette_start/1", "1/burette_end/1", "1/burette_start/2", "1/burette_end/2", "1/temperature/1"],
  );
  assert.equal(groups[0].rows[2].label, "Burette, start, filling 2");
});

test("a filling that the server knows is not opened again", () => {
  const rows = [rowOf("burette_start"), rowOf("burette_end"), rowOf("burette_start", { segment: 2 }), rowOf("burette_end", { segment: 2 })];
  const groups = layOver(sheetOf([groupOf(1, rows)]), [], ["1/2"]);
  assert.equal(groups[0].rows.length, 4);
});

test("an unsent entry of a second filling opens its rows after a reload", () => {
  const sheet = sheetOf([groupOf(1, [rowOf("burette_start"), rowOf("burette_end")])]);
  const groups = layOver(sheet, [entryOf("a", "burette_start", "0.00", { segment: 2 })], []);
  assert.equal(find(groups, 1, "burette_start", 2).value.text, "0.00");
  assert.equal(find(groups, 1, "burette_end", 2).value, null);
});

test("a replicate left out here is left out at once, and counts again at once", () => {
  const sheet = sheetOf([groupOf(1, [rowOf("burette_end"), rowOf("excluded", { required: false })])]);
  const out = entryOf("a", "excluded", "spilled or lost", { reason: "the flask fell" });
  const [group] = layOver(sheet, [out], []);
  assert.equal(group.excluded, "spilled or lost: the flask fell");
  assert.equal(group.excludedWhere, TABLET);
  const again = entryOf("b", "excluded", COUNTS_AGAIN, { strikes: "a", reason: "it was another flask" });
  assert.equal(layOver(sheet, [out, again], [])[0].excluded, null);
});

test("an entry of a replicate that the sheet does not show is kept without a row", () => {
  const sheet = sheetOf([groupOf(1, [rowOf("burette_start")])]);
  assert.equal(rowsOf(layOver(sheet, [entryOf("a", "burette_start", "0.00", { replicate: 9 })], [])).length, 1);
});

test("the next row is the server's while nothing waits", () => {
  const sheet = sheetOf([groupOf(1, [rowOf("burette_start"), rowOf("burette_end")])], { replicate: 1, slot: "burette_end", segment: 1 });
  assert.equal(nextOf(layOver(sheet, [], []), sheet, 0).slot, "burette_end");
});

test("the next row is the first missing one while entries wait", () => {
  const next = { replicate: 1, slot: "burette_start", segment: 1 };
  const sheet = sheetOf([groupOf(1, [rowOf("burette_start"), rowOf("burette_end")])], next);
  const groups = layOver(sheet, [entryOf("a", "burette_start", "0.00")], []);
  assert.equal(nextOf(groups, sheet, 1).slot, "burette_end");
});

test("a left-out replicate and a row that is not required are never next", () => {
  const sheet = sheetOf([
    groupOf(1, [rowOf("burette_start")], { excluded: "spilled or lost: fell" }),
    groupOf(2, [rowOf("remark", { replicate: 2, required: false }), rowOf("burette_start", { replicate: 2 })]),
  ]);
  assert.equal(keyOf(nextOf(layOver(sheet, [], []), sheet, 0)), "2/burette_start/1");
});

test("a filling opened here comes before the server's next row", () => {
  const rows = [rowOf("burette_start", { value: valueOf("a", "0.00") }), rowOf("burette_end", { value: valueOf("b", "24.90") }), rowOf("temperature")];
  const sheet = sheetOf([groupOf(1, rows)], { replicate: 1, slot: "temperature", segment: 1 });
  assert.equal(keyOf(nextOf(layOver(sheet, [], ["1/2"]), sheet, 0)), "1/burette_start/2");
});

test("nothing is next on a sheet that is written", () => {
  const sheet = sheetOf([groupOf(1, [rowOf("burette_start", { value: valueOf("a", "0.00") })])]);
  assert.equal(nextOf(layOver(sheet, [], []), sheet, 0), null);
});
