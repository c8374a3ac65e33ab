// What waits on the tablet, and how it is sent.

import assert from "node:assert/strict";
import test from "node:test";

import { Sender } from "../../static/js/outbox/sender.js";
import { Store, sheetsWaiting } from "../../static/js/outbox/store.js";
import { Storage, entryOf } from "./sheets.mjs";

const storeOn = (storage, { person = "p-1", sheet = "s-1" } = {}) => new Store({ storage, person, sheet });
const entry = (number, more = {}) => entryOf(`u-${number}`, "burette_end", `18.6${number}`, { device_sequence: number, ...more });

/** A server that answers by the list given, then takes everything; it remembers what it was sent. */
function serverOf(answers = []) {
  const sent = [];
  const fetcher = async (door, { body, headers }) => {
    const { entries } = JSON.parse(body);
    sent.push({ door, ids: entries.map((one) => one.id), entries, headers });
    const answer = answers.shift() ?? taking(entries);
    if (answer instanceof Error) throw answer;
    return typeof answer === "function" ? answer(entries) : answer;
  };
  return { sent, fetcher };
}

const taking = (entries, revision = 8) => reply(200, { written: entries.map(({ id }) => ({ id })), sheet: { revision } });
const reply = (status, said) => ({ ok: status < 400, status, json: async () => said });
const noNetwork = () => new TypeError("fetch failed");

function senderOf(store, { fetcher }, person = "Imke Thorvald") {
  const changes = [];
  const sender = new Sender({ store, door: "/api/sheets/s-1/entries", person, fetcher, onChange: (sheet) => changes.push(sheet) });
  return { sender, changes };
}

test("what waits survives a reload in the order in which it was written", () => {
  const storage = new Storage();
  const store = storeOn(storage);
  assert.equal(store.keep(entry(2)), true);
  assert.equal(store.keep(entry(1)), true);
  assert.equal(store.isSafe(), true);
  const reloaded = storeOn(storage);
  assert.deepEqual(reloaded.waiting().map((one) => one.id), ["u-1", "u-2"]);
  assert.equal(reloaded.waiting()[0].text, "18.61");
});

test("half-typed digits and opened fillings survive a reload", () => {
  const storage = new Storage();
  storeOn(storage).draft("1/burette_end/1", "18.6");
  storeOn(storage).open(1, 2);
  storeOn(storage).open(1, 2);
  assert.deepEqual(storeOn(storage).drafts(), { "1/burette_end/1": "18.6" });
  assert.deepEqual(storeOn(storage).opened(), ["1/2"]);
  storeOn(storage).draft("1/burette_end/1", "");
  assert.deepEqual(storeOn(storage).drafts(), {});
});

test("nobody sees or sends what another person wrote, nor what belongs to another sheet", () => {
  const storage = new Storage();
  storeOn(storage).keep(entry(1));
  assert.deepEqual(storeOn(storage, { person: "p-2" }).all(), []);
  assert.deepEqual(storeOn(storage, { sheet: "s-2" }).all(), []);
  assert.deepEqual(sheetsWaiting(storage, "p-1"), [{ sheet: "s-1", count: 1 }]);
  assert.deepEqual(sheetsWaiting(storage, "p-2"), []);
});

test("two open pages overwrite nothing of each other", () => {
  const storage = new Storage();
  const [left, right] = [storeOn(storage), storeOn(storage)];
  left.keep(entry(1));
  right.keep(entry(2));
  assert.equal(left.all().length, 2);
  left.drop("u-1");
  assert.deepEqual(right.all().map((one) => one.id), ["u-2"]);
});

test("the device has one name and its count goes on after a reload", () => {
  const storage = new Storage();
  const made = storeOn(storage).device(() => "d-1");
  assert.equal(storeOn(storage).device(() => "d-2"), made);
  assert.deepEqual([storeOn(storage).sequence(), storeOn(storage).sequence()], [1, 2]);
});

test("an entry that the browser will not keep is kept while the page is open, and said so", () => {
  const store = storeOn(new Storage(10));
  assert.equal(store.keep(entry(1)), false);
  assert.equal(store.isSafe(), false);
  assert.deepEqual(store.waiting().map((one) => one.id), ["u-1"]);
  store.drop("u-1");
  assert.equal(store.isSafe(), true);
  assert.deepEqual(store.all(), []);
});

test("a browser without storage still writes", () => {
  const store = storeOn(null);
  assert.equal(store.keep(entry(1)), false);
  assert.equal(store.waiting().length, 1);
  assert.deepEqual([store.sequence(), store.sequence()], [1, 2]);
});

test("a key that holds no entry is passed over", () => {
  const storage = new Storage();
  const store = storeOn(storage);
  store.keep(entry(1));
  storage.setItem(`${store.prefix}broken`, "{not json");
  assert.deepEqual(store.all().map((one) => one.id), ["u-1"]);
});

test("what waits is sent in one request and dropped when the server has answered", async () => {
  const store = storeOn(new Storage());
  const server = serverOf();
  store.keep(entry(1));
  store.keep(entry(2));
  const { sender, changes } = senderOf(store, server);
  await sender.flush();
  assert.deepEqual(server.sent.map((one) => one.ids), [["u-1", "u-2"]]);
  assert.deepEqual(store.all(), []);
  assert.equal(sender.state, "idle");
  assert.ok(changes.some((sheet) => sheet?.revision === 8));
});

test("the request names its door, its maker and the person it was written by", async () => {
  const store = storeOn(new Storage());
  const server = serverOf();
  store.keep(entry(1));
  await senderOf(store, server, "Jörg Ähn").sender.flush();
  const [{ door, headers }] = server.sent;
  assert.equal(door, "/api/sheets/s-1/entries");
  assert.equal(headers["X-Titrant-Ledger"], "bench");
  assert.equal(headers["X-Titrant-Person"], "J%C3%B6rg%20%C3%84hn");
});

test("without anything that waits nothing is sent", async () => {
  const server = serverOf();
  await senderOf(storeOn(new Storage()), server).sender.flush();
  assert.deepEqual(server.sent, []);
});

test("a repeated tap sends an entry once", async () => {
  const store = storeOn(new Storage());
  const server = serverOf();
  store.keep(entry(1));
  const { sender } = senderOf(store, server);
  await Promise.all([sender.flush(), sender.flush(), sender.flush()]);
  assert.deepEqual(server.sent.map((one) => one.ids), [["u-1"]]);
});

test("an entry written while another is on its way goes with the next request", async () => {
  const store = storeOn(new Storage());
  let tap;
  const server = serverOf([(entries) => (tap(), taking(entries))]);
  store.keep(entry(1));
  const { sender } = senderOf(store, server);
  tap = () => {
    store.keep(entry(2));
    sender.flush();
  };
  await sender.flush();
  assert.deepEqual(server.sent.map((one) => one.ids), [["u-1"], ["u-2"]]);
  assert.deepEqual(store.all(), []);
});

test("a call that comes while a request fails makes it try once more", async () => {
  const store = storeOn(new Storage());
  let tap;
  const server = serverOf([() => (tap(), Promise.reject(noNetwork()))]);
  store.keep(entry(1));
  const { sender } = senderOf(store, server);
  tap = () => sender.flush();
  await sender.flush();
  assert.deepEqual(server.sent.map((one) => one.ids), [["u-1"], ["u-1"]]);
  assert.equal(sender.state, "idle");
});

test("without a network everything stays, and is sent again under the same uuids", async () => {
  const store = storeOn(new Storage());
  const server = serverOf([noNetwork()]);
  store.keep(entry(1));
  const { sender } = senderOf(store, server);
  await sender.flush();
  assert.equal(sender.state, "offline");
  assert.deepEqual(store.waiting().map((one) => one.id), ["u-1"]);
  await sender.flush();
  assert.deepEqual(server.sent.map((one) => one.ids), [["u-1"], ["u-1"]]);
  assert.deepEqual(store.all(), []);
});

test("an answer lost on the way leaves the entry waiting under its uuid", async () => {
  const store = storeOn(new Storage());
  const server = serverOf([{ ok: true, status: 200, json: async () => Promise.reject(new Error("cut off")) }]);
  store.keep(entry(1));
  const { sender } = senderOf(store, server);
  await sender.flush();
  assert.deepEqual(store.waiting().map((one) => one.id), ["u-1"]);
  assert.equal(sender.state, "trouble");
});

test("signed out keeps everything and says so", async () => {
  const store = storeOn(new Storage());
  const server = serverOf([reply(401, { detail: "Sign in." })]);
  store.keep(entry(1));
  const { sender } = senderOf(store, server);
  await sender.flush();
  assert.equal(sender.state, "signed out");
  assert.equal(store.waiting().length, 1);
});

test("a server in trouble keeps everything and says what it said", async () => {
  const store = storeOn(new Storage());
  const server = serverOf([reply(503, { detail: "The database cannot be written." })]);
  store.keep(entry(1));
  const { sender } = senderOf(store, server);
  await sender.flush();
  assert.deepEqual([sender.state, sender.detail], ["trouble", "The database cannot be written."]);
  assert.equal(store.waiting().length, 1);
});

for (const status of [409, 422]) {
  test(`an answer ${status} keeps what was typed with the server's sentence`, async () => {
    const store = storeOn(new Storage());
    const problem = { detail: "The burette ends at 25 mL.", example: "18.64" };
    const server = serverOf([reply(status, problem)]);
    store.keep(entry(1, { raw: "N 99.99 mL", text: "99.99" }));
    const { sender } = senderOf(store, server);
    await sender.flush();
    assert.deepEqual(store.waiting(), []);
    const [refused] = store.refused();
    assert.deepEqual([refused.text, refused.raw, refused.problem], ["99.99", "N 99.99 mL", problem]);
    assert.equal(sender.state, "idle");
    await sender.flush();
    assert.equal(server.sent.length, 1, "a refused entry is not sent again by itself");
  });
}

test("a refused batch is sent one by one, so that one odd entry holds none back", async () => {
  const store = storeOn(new Storage());
  const server = serverOf([reply(422, { detail: "One of them." }), undefined, reply(422, { detail: "This one." }), undefined]);
  for (const number of [1, 2, 3]) store.keep(entry(number));
  await senderOf(store, server).sender.flush();
  assert.deepEqual(server.sent.map((one) => one.ids), [["u-1", "u-2", "u-3"], ["u-1"], ["u-2"], ["u-3"]]);
  assert.deepEqual(store.refused().map((one) => one.id), ["u-2"]);
  assert.equal(store.refused()[0].problem.detail, "This one.");
  assert.deepEqual(store.waiting(), []);
});

test("an answer that names none of the entries does not go round and round", async () => {
  const store = storeOn(new Storage());
  const server = serverOf([reply(200, { written: [], sheet: { revision: 8 } })]);
  store.keep(entry(1));
  const { sender } = senderOf(store, server);
  await sender.flush();
  assert.equal(server.sent.length, 1);
  assert.equal(sender.state, "trouble");
  assert.equal(store.waiting().length, 1);
});

test("entries of which the server took a part: the rest follows", async () => {
  const store = storeOn(new Storage());
  const server = serverOf([(entries) => taking(entries.slice(0, 1))]);
  store.keep(entry(1));
  store.keep(entry(2));
  await senderOf(store, server).sender.flush();
  assert.deepEqual(server.sent.map((one) => one.ids), [["u-1", "u-2"], ["u-2"]]);
  assert.deepEqual(store.all(), []);
});
