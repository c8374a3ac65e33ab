// The curves under the bench sheet: drawn by the server, fetched when something written changes.

import { curvesIn, signatureOf } from "../lib/curve_rows.js";

const rows = document.getElementById("rows");
const place = document.getElementById("curves");
const open = new Map();
let seen = "";
let asked = 0;

/** What stands in the rows: which replicates have a curve on the server, and a word for it all. */
function standing() {
  return [...rows.querySelectorAll(".row.written[data-key]")].map((row) => ({
    key: row.dataset.key,
    text: row.querySelector(".values")?.textContent ?? "",
    kept: Boolean(row.querySelector(".is-server")),
  }));
}

async function partOf(replicate) {
  const answer = await fetch(`${place.dataset.url}${replicate}/part`, { headers: { Accept: "text/html" } });
  if (!answer.ok) throw new Error(String(answer.status));
  return answer.text();
}

/** Fetch the pictures anew; what cannot be fetched now stays as it was shown. */
async function refresh() {
  const written = standing();
  const signature = signatureOf(written);
  if (signature === seen) return;
  seen = signature;
  const turn = ++asked;
  const replicates = curvesIn(written);
  try {
    const parts = await Promise.all(replicates.map(async (one) => [one, await partOf(one)]));
    if (turn !== asked) return;
    draw(new Map(parts));
  } catch {
    if (turn === asked) seen = "";
  }
}

/** The newest curve stands first and open; what a person unfolded stays unfolded. */
function draw(parts) {
  const newest = Math.max(...parts.keys());
  const drawn = [...parts].reverse().map(([replicate, html]) => {
    const holder = document.createElement("template");
    holder.innerHTML = html;
    const fold = holder.content.querySelector("details");
    fold.open = open.get(replicate) ?? replicate === newest;
    fold.addEventListener("toggle", () => open.set(replicate, fold.open));
    return fold;
  });
  place.replaceChildren(...drawn);
}

new MutationObserver(refresh).observe(rows, { childList: true });
refresh();
