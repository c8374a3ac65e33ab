// One entry on its way through the door.

import assert from "node:assert/strict";
import test from "node:test";

import { clockOf, forTheDoor, newEntry } from "../../static/js/lib/entry.js";
import { rowOf } from "./sheets.mjs";

const stamp = {
  id: "u-1", device_id: "d-1", device_sequence: 4, device_at: "2026-05-04T07:15:00.000Z", device_zone: "Europe/Zurich",
  monotonic_ms: 1234, base_revision: 7, clock: "09:15",
};

test("a new entry waits with the row's place and the reading's text", () => {
  const entry = newEntry(rowOf("burette_end"), { text: "18.60", unit: "mL", raw: "N 18.60 mL" }, { initials: "IT", stamp });
  assert.equal(entry.state, "waiting");
  assert.deepEqual([entry.replicate, entry.slot, entry.segment], [1, "burette_end", 1]);
  assert.deepEqual([entry.text, entry.unit, entry.raw], ["18.60", "mL", "N 18.60 mL"]);
  assert.deepEqual([entry.strikes, entry.reason], [null, null]);
});

test("the door gets what it takes and nothing that only the tablet knows", () => {
  const entry = newEntry(rowOf("burette_end"), { text: "18.60", unit: "mL" }, { strikes: "u-0", reason: "misread", initials: "IT", stamp });
  const sent = forTheDoor(entry);
  assert.deepEqual(Object.keys(sent).sort(), [
    "base_revision", "device_at", "device_id", "device_sequence", "device_zone", "id", "monotonic_ms", "raw", "reason",
    "replicate", "segment", "slot", "strikes", "text", "unit",
  ]);
  assert.equal(sent.strikes, "u-0");
  assert.equal(sent.raw, null);
  for (const name of ["state", "problem", "initials", "clock"]) assert.ok(!(name in sent), name);
});

test("the clock has two digits each", () => {
  assert.equal(clockOf(new Date(2026, 4, 4, 9, 5)), "09:05");
});

test("a curve goes along with its entry, and only there", () => {
  const curve = { pasted: "0.00;4.01", mapping: { volume: 0, reading: 1, kind: "pH" } };
  const entry = newEntry(rowOf("burette_end"), { text: "61 points, pH", curve }, { initials: "IT", stamp });
  assert.deepEqual(forTheDoor(entry).curve, curve);
  assert.equal("curve" in forTheDoor({ ...entry, curve: null }), false);
});
