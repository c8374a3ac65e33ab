// Puts a curve's chart into the page, in the page's own colours.

import { curveLayout, curveTraces } from "../lib/curve_traces.js";

const NAMES = ["ink", "soft", "rule", "edge", "sheet", "point", "look", "font"];
const CONFIG = {
  responsive: true,
  displaylogo: false,
  modeBarButtonsToRemove: ["toImage", "lasso2d", "select2d", "autoScale2d"],
};

/** Draw a curve's numbers into a place of the page. */
export async function curveChart(place, curve) {
  const style = getComputedStyle(document.documentElement);
  const look = Object.fromEntries(NAMES.map((name) => [name, style.getPropertyValue(`--${name}`).trim()]));
  await window.Plotly.newPlot(place, curveTraces(curve, look), curveLayout(curve, look), CONFIG);
}
