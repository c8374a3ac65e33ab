import assert from "node:assert/strict";
import { test } from "node:test";

import { codeIn, holds } from "../../static/js/lib/scanned.js";

// codes that the program's own Python made (server/lab/codes.py)
const CODES = ["974CR7Q4", "GTY2M85C", "MKJFB8XM"];

test("a label's address gives its code, whatever follows it", () => {
  for (const code of CODES) {
    assert.equal(codeIn(`https://ledger.example/b/${code}`), code);
    assert.equal(codeIn(` https://ledger.example/B/${code.toLowerCase()}/?at=24.0#at `), code);
    assert.equal(codeIn(code.toLowerCase()), code);
  }
});

test("what is no code of a bottle gives nothing", () => {
  for (const text of ["", "naoh 0.1", "https://elsewhere.example/x", "974CR7Q5", "/b/974CR74Q", "javascript:alert(1)"]) {
    assert.equal(codeIn(text), null);
  }
});

test("every single wrong character and every swap of neighbours fails the check", () => {
  const alphabet = "0123456789ABCDEFGHJKMNPQRSTWXYZ";
  for (const code of CODES) {
    assert.ok(holds(code));
    for (let i = 0; i < code.length; i += 1) {
      for (const other of alphabet) {
        if (other !== code[i]) assert.ok(!holds(code.slice(0, i) + other + code.slice(i + 1)));
      }
      if (i && code[i] !== code[i - 1]) assert.ok(!holds(code.slice(0, i - 1) + code[i] + code[i - 1] + code.slice(i + 1)));
    }
  }
});
