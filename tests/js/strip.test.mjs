// The words of the strip.

import assert from "node:assert/strict";
import test from "node:test";

import { entries, lineParts, networkSays, toGo } from "../../static/js/lib/strip.js";

const margin = (more = {}) => ({ replicates: [], unit: "mol/L", mean: null, spread: null, to_go: 4, says: "", finding: null, ...more });
const one = (label, value, excluded = false) => ({ label, value, says: "", excluded });

test("entries are counted in words", () => {
  assert.deepEqual([entries(1), entries(2)], ["1 entry", "2 entries"]);
});

test("nothing is said while all entries are on the server", () => {
  assert.equal(networkSays({ waiting: 0, refused: 0, state: "idle" }), "");
});

test("offline says how many entries wait and that nothing is lost", () => {
  assert.equal(
    networkSays({ waiting: 2, refused: 0, state: "offline" }),
    "No network: 2 entries wait on this tablet, nothing is lost.",
  );
  assert.equal(
    networkSays({ waiting: 1, refused: 0, state: "offline" }),
    "No network: 1 entry waits on this tablet, nothing is lost.",
  );
});

test("a browser that stores nothing is told to keep the page open, and is promised nothing", () => {
  const says = networkSays({ waiting: 1, refused: 0, state: "offline", stored: false });
  assert.equal(says, "No network: 1 entry waits in this page alone, for this browser stores nothing: keep it open.");
});

test("signed out says to sign in again", () => {
  assert.match(networkSays({ waiting: 1, refused: 0, state: "signed out" }), /Sign in again to send\.$/);
});

test("trouble says what the server said, once, with one full stop", () => {
  assert.equal(
    networkSays({ waiting: 1, refused: 0, state: "trouble", detail: "The disk is full." }),
    "The disk is full. 1 entry waits on this tablet, nothing is lost.",
  );
});

test("entries not taken are named beside those that wait", () => {
  assert.equal(networkSays({ waiting: 0, refused: 1, state: "idle" }), "1 entry not taken: see the row.");
  assert.match(networkSays({ waiting: 1, refused: 2, state: "offline" }), /nothing is lost\. 2 entries not taken/);
});

test("the line has mean and spread first, then what is to go, then the newest replicates", () => {
  const so_far = margin({
    replicates: [one("1", "0.09992"), one("2", "0.09985"), one("3", null)],
    mean: "0.09988", spread: "0.053 %", to_go: 2,
  });
  assert.deepEqual(
    lineParts(so_far).map(({ term, value }) => `${term} ${value}`.trim()),
    ["mean 0.09988", "spread 0.053 %", "2 to go", "no. 2 0.09985", "no. 1 0.09992"],
  );
});

test("a replicate left out of the mean is no part of the line", () => {
  const parts = lineParts(margin({ replicates: [one("1", "0.09992", true), one("2", "0.09985")], to_go: 3 }));
  assert.ok(parts.some((part) => part.term === "no. 2"));
  assert.ok(!parts.some((part) => part.term === "no. 1"));
});

test("how far the sheet has come is said in full before there is a value", () => {
  assert.equal(toGo(margin()), "4 replicates to go");
  assert.equal(toGo(margin({ to_go: 1 })), "1 replicate to go");
  assert.equal(toGo(margin({ to_go: 2, replicates: [one("1", "0.09992")] })), "2 to go");
  assert.equal(toGo(margin({ to_go: 0, replicates: [one("1", "0.09992")] })), "all written");
});
