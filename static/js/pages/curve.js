// The curve that can be zoomed into: offered when the chart script has come, never put in the way.

import { curveChart } from "../widgets/curve_chart.js";

const script = document.getElementById("chart-script");
const place = document.getElementById("chart");
const drawn = document.getElementById("drawn");
const asPicture = document.getElementById("as-picture");
const asChart = document.getElementById("as-chart");
const says = document.getElementById("chart-says");
let made = false;

function offer() {
  document.getElementById("switch").classList.add("is-ready");
}

function show(chart) {
  drawn.hidden = chart;
  place.hidden = !chart;
  asPicture.setAttribute("aria-pressed", String(!chart));
  asChart.setAttribute("aria-pressed", String(chart));
}

async function makeChart() {
  const answer = await fetch(place.dataset.url, { headers: { Accept: "application/json" } });
  if (!answer.ok) throw new Error(String(answer.status));
  await curveChart(place, await answer.json());
  made = true;
}

asPicture.addEventListener("click", () => {
  show(false);
  says.textContent = "";
});

asChart.addEventListener("click", async () => {
  show(true);
  try {
    if (!made) await makeChart();
    says.textContent = "Drag over the chart to zoom, press twice to see all again.";
  } catch {
    show(false);
    says.textContent = "The numbers for the chart did not come; what is drawn here is whole.";
  }
});

if (window.Plotly) offer();
else script.addEventListener("load", offer);
