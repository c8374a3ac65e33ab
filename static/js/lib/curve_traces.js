// From a curve's numbers to the traces and the layout of its chart. Free of the page.

const SYMBOLS = {
  "steepest segment": "square",
  "first derivative": "triangle-up",
  "second derivative": "triangle-down",
  "gran acid side": "triangle-right",
  "gran alkaline side": "triangle-left",
  "model fit": "circle",
};

/** Packed floats as an array; what is an array already stays. */
export function unpacked(packed) {
  if (Array.isArray(packed)) return packed;
  const bytes = Uint8Array.from(atob(packed.bdata), (one) => one.charCodeAt(0));
  const view = new DataView(bytes.buffer);
  return Array.from({ length: bytes.length / 4 }, (_, at) => view.getFloat32(4 * at, true));
}

/** The value of a line at a place, between its two neighbours. */
export function valueAt(xs, ys, x) {
  const after = Math.max(1, xs.findIndex((one) => one >= x));
  const [x0, x1, y0, y1] = [xs[after - 1], xs[after], ys[after - 1], ys[after]];
  return x1 === x0 ? y1 : y0 + ((y1 - y0) * (x - x0)) / (x1 - x0);
}

/** Traces of the readings, the fitted line, each method's volume, slopes and residuals. */
export function curveTraces(curve, look) {
  const aside = new Set(curve.aside);
  const [V, y] = [unpacked(curve.points.x), unpacked(curve.points.y)];
  const pick = (values, out) => values.filter((_, at) => aside.has(at) === out);
  const hover = `%{x:.4f} mL, ${curve.kind} %{y:.4f}`;
  const traces = [];
  let [lineX, lineY] = [V, y];
  if (curve.model) {
    [lineX, lineY] = [unpacked(curve.model.x), unpacked(curve.model.y)];
    traces.push({ name: "fitted curve", x: lineX, y: lineY, mode: "lines", line: { color: look.soft, width: 1.5 }, hoverinfo: "skip" });
  }
  traces.push({ name: "readings", x: pick(V, false), y: pick(y, false), mode: "markers", marker: { color: look.ink, size: 5 }, hovertemplate: hover });
  if (aside.size) {
    traces.push({ name: "little or no weight", x: pick(V, true), y: pick(y, true), mode: "markers", marker: { color: look.look, size: 9, symbol: "x-thin-open", line: { width: 2 } }, hovertemplate: hover });
  }
  for (const one of curve.marks) {
    traces.push({
      name: one.method,
      x: [one.volume],
      y: [valueAt(lineX, lineY, one.volume)],
      mode: "markers",
      error_x: { type: "constant", value: 2 * one.u, color: one.taken ? look.point : look.ink, thickness: 1.2 },
      marker: {
        symbol: SYMBOLS[one.method] ?? "circle",
        size: one.taken ? 14 : 11,
        color: one.taken ? look.point : look.sheet,
        line: { width: 1.6, color: one.taken ? look.sheet : look.ink },
      },
      hovertemplate: `${one.method}: %{x:.4f} mL ± ${(2 * one.u).toPrecision(2)} (2 u)`,
    });
  }
  traces.push({ name: "steepness", x: unpacked(curve.slopes.x), y: unpacked(curve.slopes.y), mode: "lines", line: { color: look.ink, width: 1.4, shape: "hvh" }, yaxis: "y2", showlegend: false, hovertemplate: `%{x:.4f} mL, %{y:.3f} ${curve.kind} per mL` });
  if (curve.residuals) {
    traces.push({ name: "residuals", x: V, y: unpacked(curve.residuals), mode: "markers", marker: { color: look.ink, size: 5 }, yaxis: "y3", showlegend: false, hovertemplate: "%{x:.4f} mL, %{y:.2f} times its scatter" });
  }
  return traces.map((one) => ({ type: "scatter", ...one }));
}

/** The layout: three pictures over one axis of volumes, in the colours of the page. */
export function curveLayout(curve, look) {
  const axis = { gridcolor: look.rule, linecolor: look.edge, zerolinecolor: look.edge, ticks: "outside", tickcolor: look.edge };
  const split = curve.residuals ? [0.52, 0.47, 0.27, 0.21] : [0.34, 0.28, 0, 0];
  const taken = curve.marks.find((one) => one.taken);
  return {
    paper_bgcolor: look.sheet,
    plot_bgcolor: look.sheet,
    font: { family: look.font, color: look.ink, size: 14 },
    margin: { l: 64, r: 12, t: 8, b: 52 },
    hoverlabel: { bgcolor: look.sheet, bordercolor: look.edge, font: { color: look.ink } },
    legend: { orientation: "h", y: 1.02, yanchor: "bottom", x: 0 },
    dragmode: "zoom",
    xaxis: { ...axis, title: { text: "titrant, mL" }, anchor: curve.residuals ? "y3" : "y2" },
    yaxis: { ...axis, domain: [split[0], 1], title: { text: curve.kind } },
    yaxis2: { ...axis, domain: [split[2], split[1]], title: { text: "steepness" } },
    ...(curve.residuals ? { yaxis3: { ...axis, domain: [0, split[3]], title: { text: "residual" } } } : {}),
    shapes: taken
      ? [{ type: "line", xref: "x", yref: "paper", x0: taken.volume, x1: taken.volume, y0: 0, y1: 1, line: { color: look.point, width: 1.5 } }]
      : [],
  };
}
