import assert from "node:assert/strict";
import test from "node:test";

import { postJson } from "../../static/js/outbox/asking.js";

const answering = (status, text) => {
  const sent = [];
  const fetcher = async (address, options) => {
    sent.push({ address, ...options });
    return new Response(text, { status });
  };
  return { sent, fetcher };
};

test("what is posted carries the header of the bench and the person in letters that a header takes", async () => {
  const { sent, fetcher } = answering(200, '{"written": []}');
  const told = await postJson({ fetcher, person: "Ümit 7" }, "/door", { a: "18.60" }, 1000);
  assert.deepEqual(told, { ok: true, status: 200, said: { written: [] } });
  assert.equal(sent[0].address, "/door");
  assert.equal(sent[0].method, "POST");
  assert.equal(sent[0].headers["X-Titrant-Ledger"], "bench");
  assert.equal(sent[0].headers["X-Titrant-Person"], "%C3%9Cmit%207");
  assert.equal(sent[0].body, '{"a":"18.60"}');
});

test("a refusal is told with its status and words, an answer without JSON with none", async () => {
  const refused = await postJson(answering(422, '{"detail": "No."}'), "/door", {}, 1000);
  assert.deepEqual(refused, { ok: false, status: 422, said: { detail: "No." } });
  const odd = await postJson(answering(502, "<html>"), "/door", {}, 1000);
  assert.deepEqual(odd, { ok: false, status: 502, said: {} });
});

test("nobody answering is status 0, never an error", async () => {
  const fetcher = async () => {
    throw new TypeError("no network");
  };
  assert.deepEqual(await postJson({ fetcher }, "/door", {}, 1000), { ok: false, status: 0, said: {} });
});
