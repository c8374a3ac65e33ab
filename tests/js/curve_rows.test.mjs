// Which curves the bench page shows, and when it asks for them anew.

import assert from "node:assert/strict";
import test from "node:test";

import { curvesIn, signatureOf } from "../../static/js/lib/curve_rows.js";

const row = (key, text, kept = true) => ({ key, text, kept });

test("curves on the server are shown in order, those on the tablet wait", () => {
  const written = [row("3/curve/1", "c"), row("1/curve/1", "a"), row("2/curve/1", "b", false), row("1/mass/1", "0.4")];
  assert.deepEqual(curvesIn(written), [1, 3]);
});

test("nothing is asked while there is no curve", () => {
  assert.equal(signatureOf([row("1/mass/1", "0.4")]), "");
});

test("another entry on the server asks for the curves anew, one that waits does not", () => {
  const before = [row("1/curve/1", "a"), row("1/mass/1", "0.4")];
  assert.equal(signatureOf(before), signatureOf([...before, row("2/mass/1", "0.5", false)]));
  assert.notEqual(signatureOf(before), signatureOf([row("1/curve/1", "a"), row("1/mass/1", "0.41")]));
});
