// The strip beside the sheet: values so far, what is still to do, the first finding, the network.

import { lineParts, networkSays } from "../lib/strip.js";
import { el, markOf } from "./dom.js";

/** The strip as a card, for wide pages. */
export function cardOf(margin, network) {
  const rows = margin.replicates.flatMap((one) => [
    el("dt", {}, one.label),
    el("dd", { class: one.excluded ? "is-out" : one.value ? "" : "soft" }, one.value ?? one.says, one.excluded ? " left out" : ""),
  ]);
  return el(
    "section",
    { class: "card-strip", "aria-labelledby": "so-far" },
    el("h2", { id: "so-far" }, "So far", margin.unit ? el("span", { class: "soft" }, ` in ${margin.unit}`) : null),
    el("dl", {}, rows, pair("mean", margin.mean), pair("spread", margin.spread)),
    margin.says ? el("p", { class: "to-go" }, margin.says) : null,
    findingOf(margin.finding),
    networkOf(network),
  );
}

/** The strip in one line that opens to the card, for narrow pages. */
export function lineOf(margin, network, { open, onToggle }) {
  const parts = lineParts(margin).map((part) =>
    el("span", { class: "part" }, el("span", { class: "soft" }, `${part.term} `), el("span", { class: "digits" }, part.value)),
  );
  const says = el("span", { class: "part to-go" }, margin.says || "Nothing weighed yet.");
  const line = el(
    "details",
    { class: "line-strip", open },
    el("summary", {}, el("span", { class: "line" }, networkSays(network) ? el("span", { class: "part unsent" }, short(network)) : null, parts, says)),
    cardOf(margin, network),
  );
  line.addEventListener("toggle", () => onToggle(line.open));
  return line;
}

function short({ waiting, refused, state }) {
  if (refused > 0) return `${refused} not taken`;
  return state === "offline" ? `no network, ${waiting} on this tablet` : `${waiting} on this tablet`;
}

function pair(term, value) {
  return [
    el("dt", { class: "soft" }, term),
    el("dd", { class: value ? "sum" : "soft" }, value ?? "from two on"),
  ];
}

function findingOf(finding) {
  if (!finding) return null;
  return el(
    "p",
    { class: `finding ${finding.verdict}` },
    markOf(finding.verdict),
    el("span", {}, el("b", {}, `${finding.verdict[0].toUpperCase()}${finding.verdict.slice(1)} `), finding.says),
  );
}

function networkOf(network) {
  const says = networkSays(network);
  if (!says) return null;
  const again = network.state === "signed out" ? el("a", { href: "/sign-in" }, "Sign in") : null;
  return el("p", { class: "network" }, says, " ", again);
}
