// What a row asks before it takes an odd value.

import assert from "node:assert/strict";
import test from "node:test";

import { questionFor } from "../../static/js/lib/questions.js";

const end = { replicate: 2, slot: "burette_end", segment: 1, label: "Burette, end", unit: "mL", low: "0", high: "25" };
const written = (slot, text, more = {}) => ({ replicate: 2, slot, segment: 1, value: { text }, ...more });
const reading = (text, settled = true) => ({ text, settled });
const keys = (question) => question.answers.map((one) => one.key);

test("an end below the start asks whether the burette was refilled", () => {
  const question = questionFor(end, reading("18.64"), [written("burette_start", "20.10")]);
  assert.equal(question.says, "18.64 mL is less than the start, 20.10 mL. Refilled?");
  assert.deepEqual(keys(question), ["segment", "again"]);
});

test("an end at or above the start asks nothing", () => {
  const rows = [written("burette_start", "0.10")];
  assert.equal(questionFor(end, reading("0.10"), rows), null);
  assert.equal(questionFor(end, reading("18,64"), rows), null);
});

test("only the start of the same replicate and filling counts", () => {
  const others = [
    written("burette_start", "24.00", { replicate: 1 }),
    written("burette_start", "24.00", { segment: 2 }),
    written("burette_end", "24.00"),
  ];
  assert.equal(questionFor(end, reading("18.64"), others), null);
});

test("an end without a start asks nothing about it", () => {
  assert.equal(questionFor(end, reading("18.64"), [{ ...written("burette_start", ""), value: null }]), null);
});

test("the start is compared as digits, not as text", () => {
  assert.equal(questionFor(end, reading("10.00"), [written("burette_start", "9.98")]), null);
});

test("a container that is not lighter afterwards can only be typed again", () => {
  const after = { replicate: 2, slot: "container_less_standard", segment: 1, label: "Container after", unit: "g" };
  const rows = [written("container_and_standard", "60.5450")];
  assert.deepEqual(keys(questionFor(after, reading("60.5450"), rows)), ["again"]);
  assert.match(questionFor(after, reading("60.6000"), rows).says, /nothing would have been weighed out/);
  assert.equal(questionFor(after, reading("60.1562"), rows), null);
});

test("a line that had not settled asks before it is written", () => {
  const question = questionFor(end, reading("18.64", false), []);
  assert.match(question.says, /has settled/);
  assert.deepEqual(keys(question), ["again", "anyway"]);
});

const titrant = { replicate: 0, slot: "temperature", segment: 1, label: "Temperature", unit: "Cel", low: "0", high: "40", usual_low: "15", usual_high: "30" };

test("an unusual value is asked about and may be written", () => {
  const question = questionFor(titrant, reading("31.0"), []);
  assert.equal(question.says, "31.0 °C is unusual: it is more than 30 °C.");
  assert.deepEqual(keys(question), ["again", "anyway"]);
  assert.match(questionFor(titrant, reading("14.9"), []).says, /less than 15 °C/);
});

test("a value beyond what is possible cannot be written where usual bounds are stated", () => {
  const question = questionFor(titrant, reading("41.0"), []);
  assert.equal(question.says, "41.0 °C is not possible here: it is more than 40 °C.");
  assert.deepEqual(keys(question), ["again"]);
});

test("one usual bound is enough to make the possible ones firm", () => {
  const pressure = { ...titrant, unit: "hPa", low: "500", high: "1100", usual_low: "600", usual_high: null };
  assert.deepEqual(keys(questionFor(pressure, reading("1200"), [])), ["again"]);
  assert.deepEqual(keys(questionFor(pressure, reading("550"), [])), ["again", "anyway"]);
});

test("what is outside the possible can only be typed again", () => {
  assert.deepEqual(keys(questionFor(end, reading("26.00"), [])), ["again"]);
});

test("bounds themselves are inside", () => {
  for (const text of ["15.0", "30.0"]) assert.equal(questionFor(titrant, reading(text), []), null);
});

test("a row without bounds asks nothing", () => {
  assert.equal(questionFor({ ...titrant, low: null, high: null, usual_low: null, usual_high: undefined }, reading("99"), []), null);
});
