// Readings as typed, and lines that a balance or meter sends.

import assert from "node:assert/strict";
import test from "node:test";

import { compare, decimalsOf, echo, exampleFor, readLine, readReason, readTyped, readWords, unitOf } from "../../static/js/lib/reading.js";

const burette = { label: "Burette, end", unit: "mL", decimals: 2, signed: false };
const balance = { label: "Container after", unit: "g", decimals: 4, signed: false };
const titrant = { label: "Temperature of the titrant", unit: "Cel", decimals: 1, signed: false };
const free = { label: "Air pressure", unit: "hPa", decimals: null, signed: false };
const signed = { label: "Potential", unit: "mV", decimals: 1, signed: true };

test("a number with a point is kept digit by digit", () => {
  assert.deepEqual(readTyped("18.60", burette), { text: "18.60", unit: "mL", raw: null, settled: true });
  assert.equal(readTyped("0060.5450", balance).text, "0060.5450");
});

test("a number with a comma is kept as it was typed", () => {
  assert.equal(readTyped("18,60", burette).text, "18,60");
});

test("blanks around a number are no part of it", () => {
  assert.equal(readTyped("  18.60 ", burette).text, "18.60");
});

test("a missing final zero is refused with the number of decimals", () => {
  const { says, text } = readTyped("18.6", burette);
  assert.equal(text, undefined);
  assert.match(says, /including final zeros: 2 after the point, for example 18\.64\./);
  assert.match(readTyped("18", burette).says, /final zeros/);
});

test("a decimal more than the instrument shows is refused", () => {
  assert.equal(
    readTyped("18.600", burette).says,
    "18.600 has 3 digits after the point; the instrument shows 2, for example 18.64.",
  );
});

test("a row that states no decimals takes any", () => {
  assert.equal(readTyped("1008", free).text, "1008");
  assert.equal(readTyped("1008.65", free).text, "1008.65");
});

test("nothing typed is refused by the name of the row", () => {
  for (const typed of ["", "   ", "\t"]) assert.match(readTyped(typed, burette).says, /^Type the Burette, end first/);
});

test("what is no number is refused and said back", () => {
  for (const typed of ["abc", "1.2.3", "1,2,3", "1,234.5", "12.", ".5", "1e3", "--4", "18.60 x y", "０.５０", "NaN", "∞"]) {
    const { says, text } = readTyped(typed, burette);
    assert.equal(text, undefined, typed);
    assert.ok(says.includes(`“${typed}” is not a number`), says);
  }
});

test("a minus is refused where nothing can be negative", () => {
  assert.match(readTyped("-0.10", burette).says, /^Burette, end cannot be negative/);
});

test("a typographic minus is written as a hyphen where the row takes a sign", () => {
  assert.equal(readTyped("\u221212.5", signed).text, "-12.5");
  assert.equal(readTyped("-12.5", signed).text, "-12.5");
});

test("a line of a balance gives number, unit, stability and the line itself", () => {
  assert.deepEqual(readTyped("N     60.5450 g", balance), {
    text: "60.5450",
    unit: "g",
    raw: "N     60.5450 g",
    settled: true,
  });
});

test("the raw line keeps its blanks", () => {
  assert.equal(readTyped("  S    60.5450 g  ", balance).raw, "  S    60.5450 g  ");
});

test("a line without a mark of rest, or with another, has not settled", () => {
  assert.equal(readLine("60.5450 g").settled, true);
  assert.equal(readLine("S 60.5450 g").settled, true);
  assert.equal(readLine("D 60.5450 g").settled, false);
  assert.equal(readLine("? 60.5450 g").settled, false);
  assert.equal(readLine("60.5450 g ?").settled, false);
});

test("a line may carry two marks, and has settled only by both", () => {
  assert.deepEqual([readLine("S S     60.5450 g").text, readLine("S S     60.5450 g").settled], ["60.5450", true]);
  assert.equal(readLine("ST,NET,+ 60.5450 g").settled, true);
  assert.equal(readLine("S D     60.5450 g").settled, false);
  assert.equal(readLine("US,NET,+ 60.5450 g").settled, false);
  assert.equal(readLine("S S S   60.5450 g"), null);
});

test("a bare number is no line", () => {
  assert.equal(readLine("60.5450"), null);
  assert.equal(readLine("60.5450 stone"), null);
});

test("a plus of a line is left out and a minus is kept", () => {
  assert.equal(readLine("N + 0.3888 g").text, "0.3888");
  assert.equal(readLine("N - 0.0003 g").text, "-0.0003");
});

test("a line in another unit is refused in the units that people read", () => {
  assert.equal(
    readTyped("N 388.8 mg", balance).says,
    "The line is in mg, this row is in g. Set the instrument to g and send it again.",
  );
  assert.match(readTyped("N 1.23 mV", titrant).says, /this row is in °C\. Set the instrument to °C/);
});

test("a thermometer's line in °C is read", () => {
  assert.equal(readTyped("S 21.3 °C", titrant).text, "21.3");
  assert.equal(readTyped("S 21.3 C", titrant).text, "21.3");
  assert.equal(readTyped("S 18.60 ml", burette).text, "18.60");
});

test("decimals are counted after point and comma alike", () => {
  assert.equal(decimalsOf("18"), 0);
  assert.equal(decimalsOf("18.60"), 2);
  assert.equal(decimalsOf("18,6"), 1);
});

test("what was typed is said back with its decimals", () => {
  assert.equal(echo("18.60", "mL"), "18.60 mL (2 decimals)");
  assert.equal(echo("7", ""), "7 (0 decimals)");
  assert.equal(echo("21.3", "°C"), "21.3 °C (1 decimal)");
});

test("an example has the row's decimals", () => {
  assert.equal(exampleFor(balance), "60.5450");
  assert.equal(exampleFor({ ...balance, decimals: 5 }), "60.54500");
  assert.equal(exampleFor({ ...burette, decimals: 0 }), "18");
});

test("units are written as people read them", () => {
  assert.equal(unitOf(titrant), "°C");
  assert.equal(unitOf(burette), "mL");
  assert.equal(unitOf({ unit: null }), "");
  assert.equal(unitOf({}), "");
});

test("numbers are compared digit by digit, also where floats cannot", () => {
  assert.equal(compare("18.60", "18.6"), 0);
  assert.equal(compare("18,64", "20.10"), -1);
  assert.equal(compare("100", "99.9999"), 1);
  assert.equal(compare("9007199254740993", "9007199254740992"), 1);
  assert.equal(compare("0.1234567890123456789", "0.1234567890123456788"), 1);
  assert.equal(compare("-0.50", "0.10"), -1);
  assert.equal(compare("-0.5", "-0.4"), -1);
});

const remark = { label: "Remark", unit: null };

test("words are kept as written, without outer blanks", () => {
  assert.deepEqual(readWords("  Drop at the tip\nrinsed in.  ", remark), { text: "Drop at the tip\nrinsed in." });
  assert.equal(readWords("<b>&amp;</b>", remark).text, "<b>&amp;</b>");
});

test("no words are refused by the name of the row", () => {
  for (const typed of ["", " \n "]) assert.equal(readWords(typed, remark).says, "Type the Remark first.");
});

test("words beyond what is kept are refused, never cut", () => {
  assert.equal(readWords("r".repeat(2000), remark).text.length, 2000);
  assert.equal(
    readWords("r".repeat(2001), remark).says,
    "Remark takes up to 2000 characters; this has 2001. Shorten it.",
  );
});

test("a letter of two halves counts once", () => {
  assert.equal(readWords("\u{1F9EA}".repeat(2000), remark).says, undefined);
});

test("a reason is asked for where there is none, and refused where it is too long", () => {
  assert.deepEqual(readReason("  ", "Say why."), { says: "Say why." });
  assert.deepEqual(readReason(" misread ", "Say why."), { text: "misread" });
  assert.equal(readReason("r".repeat(1000), "Say why.").text.length, 1000);
  assert.match(readReason("r".repeat(1001), "Say why.").says, /up to 1000 characters; this has 1001/);
});
