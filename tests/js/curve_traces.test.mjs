// A curve's numbers become traces and a layout.

import assert from "node:assert/strict";
import test from "node:test";

import { curveLayout, curveTraces, unpacked, valueAt } from "../../static/js/lib/curve_traces.js";

const pack = (values) => ({ dtype: "f4", bdata: Buffer.from(Float32Array.from(values).buffer).toString("base64") });
const look = { ink: "#111", soft: "#555", rule: "#ddd", edge: "#888", sheet: "#fff", point: "#b0125f", look: "#750", font: "sans" };
const curve = (more = {}) => ({
  kind: "pH",
  points: { x: pack([0, 1, 2, 3]), y: pack([4, 5, 9, 10]) },
  aside: [],
  model: null,
  slopes: { x: pack([0.5, 1.5, 2.5]), y: pack([1, 4, 1]) },
  residuals: null,
  marks: [
    { method: "first derivative", volume: 1.5, u: 0.1, taken: false },
    { method: "model fit", volume: 1.6, u: 0.01, taken: true },
  ],
  gran: [],
  ...more,
});

test("packed floats come back as they were", () => {
  assert.deepEqual(unpacked(pack([0.5, -2, 21.75])), [0.5, -2, 21.75]);
  assert.deepEqual(unpacked([1, 2]), [1, 2]);
});

test("the value at a volume lies between its neighbours", () => {
  assert.equal(valueAt([0, 1, 2], [4, 5, 9], 1.5), 7);
  assert.equal(valueAt([0, 1, 1], [4, 5, 6], 0), 4);
});

test("a mark stands on the curve and the taken one alone carries the accent", () => {
  const traces = curveTraces(curve(), look);
  const mark = (name) => traces.find((one) => one.name === name);
  assert.deepEqual([mark("first derivative").x, mark("first derivative").y], [[1.5], [7]]);
  assert.equal(mark("model fit").marker.color, look.point);
  assert.equal(mark("first derivative").marker.color, look.sheet);
  assert.equal(mark("model fit").error_x.value, 0.02);
  assert.notEqual(mark("model fit").marker.symbol, mark("first derivative").marker.symbol);
});

test("readings that count little are a trace of their own, by shape", () => {
  const traces = curveTraces(curve({ aside: [1] }), look);
  const [readings, aside] = ["readings", "little or no weight"].map((name) => traces.find((one) => one.name === name));
  assert.deepEqual([readings.x, aside.x], [[0, 2, 3], [1]]);
  assert.match(aside.marker.symbol, /^x/);
});

test("residuals have a picture of their own where there is a fit", () => {
  const fitted = curve({ residuals: pack([0, 1, -1, 0]), model: { x: pack([0, 3]), y: pack([4, 10]) } });
  assert.ok(curveTraces(fitted, look).some((one) => one.yaxis === "y3"));
  assert.equal(curveLayout(fitted, look).xaxis.anchor, "y3");
  assert.ok(!curveTraces(curve(), look).some((one) => one.yaxis === "y3"));
  assert.equal(curveLayout(curve(), look).yaxis3, undefined);
});

test("the upright line stands at the volume that is taken", () => {
  assert.equal(curveLayout(curve(), look).shapes[0].x0, 1.6);
  assert.deepEqual(curveLayout(curve({ marks: [] }), look).shapes, []);
});
