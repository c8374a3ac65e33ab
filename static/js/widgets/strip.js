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
  const line = el(
    "details",
    { class: "line-strip", open },
    el("summary", {}, el("span", { class: "line" }, unsentOf(network), verdictOf(margin.finding), lineParts(margin).map(partOf))),
    cardOf(margin, network),
  );
  line.addEventListener("toggle", () => onToggle(line.open));
  return line;
}

function partOf({ term, value }) {
  const shown = el("span", { class: term ? "digits" : "to-go" }, value);
  return el("span", { class: "part" }, term ? el("span", { class: "soft" }, `${term} `) : null, shown);
}

function unsentOf(network) {
  return networkSays(network) ? el("span", { class: "part unsent" }, short(network)) : null;
}

function verdictOf(finding) {
  if (!finding) return null;
  return el("span", { class: `part ${finding.verdict}` }, markOf(finding.verdict), el("b", {}, capital(finding.verdict)));
}

function capital(word) {
  return `${word[0].toUpperCase()}${word.slice(1)}`;
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
    el("span", {}, el("b", {}, `${capital(finding.verdict)} `), finding.says),
  );
}

function networkOf(network) {
  const says = networkSays(network);
  if (!says) return null;
  const again = network.state === "signed out" ? el("a", { href: "/sign-in" }, "Sign in") : null;
  return el("p", { class: "network" }, says, " ", again);
}
