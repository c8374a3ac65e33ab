// The keys of the number pad.

import assert from "node:assert/strict";
import test from "node:test";

import { press } from "../../static/js/lib/pad.js";

const typed = (...keys) => keys.reduce(press, "");

test("digits and the point follow one another", () => {
  assert.equal(typed("1", "8", ".", "6", "0"), "18.60");
});

test("a point at the start gets a zero before it", () => {
  assert.equal(typed(".", "1"), "0.1");
  assert.equal(typed("±", ".", "5"), "-0.5");
});

test("a second point is not taken, whether point or comma came first", () => {
  assert.equal(typed("1", ".", "2", "."), "1.2");
  assert.equal(press("1,2", "."), "1,2");
});

test("back takes one sign away and nothing from nothing", () => {
  assert.equal(typed("1", "8", "back"), "1");
  assert.equal(press("", "back"), "");
});

test("the sign turns and turns back", () => {
  assert.equal(typed("5", "±"), "-5");
  assert.equal(typed("5", "±", "±"), "5");
});

test("a text of 32 signs grows no longer and can still be shortened", () => {
  const full = "1".repeat(32);
  assert.equal(press(full, "2"), full);
  assert.equal(press(full, "."), full);
  assert.equal(press(full, "back").length, 31);
});
