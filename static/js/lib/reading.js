// A typed reading is text from the key to the ledger: nothing here turns it into a float.

const NUMBER = /^[-\u2212]?\d+(?:[.,]\d+)?$/;
const MARK = "[A-Za-z*?]{1,4}";
const LINE = new RegExp(
  `^\\s*((?:${MARK}[\\s,:]+){0,2})([+-]?)\\s*(\\d+(?:[.,]\\d+)?)\\s*(?:\\[?(mg|g|kg|mL|ml|L|°C|C|mV|pH|hPa|%)\\]?)?\\s*(${MARK})?\\s*$`,
);
const SETTLED = new Set(["N", "NET", "G", "S", "ST"]);
const MOST_WORDS = 2000;
const MOST_REASON = 1000;
const SPELLED = { ml: "mL", C: "°C" };

/** The digits after the point or comma of a number as typed. */
export function decimalsOf(text) {
  const at = text.search(/[.,]/);
  return at < 0 ? 0 : text.length - at - 1;
}

/** What was typed, said back: "18.60 mL (2 decimals)". */
export function echo(text, unit) {
  const count = decimalsOf(text);
  const decimals = count === 1 ? "1 decimal" : `${count} decimals`;
  return `${text}${unit ? ` ${unit}` : ""} (${decimals})`;
}

/** Number, unit and stability of a line sent by a balance or meter, or null if it is none. */
export function readLine(line) {
  const found = LINE.exec(line);
  if (!found) return null;
  const [, before, sign, digits, unit = null, after = ""] = found;
  if (!unit && !before) return null;
  const marks = `${before} ${after}`.toUpperCase().match(/[A-Z*?]+/g) ?? [];
  return {
    text: sign === "-" ? `-${digits}` : digits,
    unit: SPELLED[unit] ?? unit,
    settled: marks.every((mark) => SETTLED.has(mark)),
    raw: line,
  };
}

/** A number like those that this row takes, for the example beside a refusal. */
export function exampleFor(row) {
  if (row.unit === "hPa" || row.unit === "%") return row.usual_low ?? (row.unit === "hPa" ? "1008.6" : "47");
  const whole = row.unit === "g" ? "60" : row.unit === "mL" ? "18" : "21";
  const digits = { g: "5450", mL: "6400" }[row.unit] ?? "4000";
  const places = row.decimals ?? 2;
  return places > 0 ? `${whole}.${digits.padEnd(places, "0").slice(0, places)}` : whole;
}

/**
 * What a row makes of a text: `{text, unit, raw, settled}` as it will be written, or
 * `{says}` with what is wrong and an example.
 */
export function readTyped(typed, row) {
  const bare = typed.trim();
  if (bare === "") return { says: `Type the ${row.label} first, for example ${exampleFor(row)}.` };
  const plain = NUMBER.test(bare);
  const line = plain ? null : readLine(typed);
  if (!plain && !line) {
    return { says: `“${bare}” is not a number. Type digits with one point or comma, for example ${exampleFor(row)}.` };
  }
  if (line?.unit && row.unit && line.unit !== unitOf(row)) {
    return { says: `The line is in ${line.unit}, this row is in ${unitOf(row)}. Set the instrument to ${unitOf(row)} and send it again.` };
  }
  const text = plain ? bare.replace("\u2212", "-") : line.text;
  const wrong = decimalsSay(text, row) ?? signSays(text, row);
  if (wrong) return { says: wrong };
  return { text, unit: row.unit, raw: line ? line.raw : null, settled: line ? line.settled : true };
}

/** What a row of words makes of a text: `{text}` as it will be written, or `{says}` what is wrong. */
export function readWords(typed, row) {
  const text = typed.trim();
  if (text === "") return { says: `Type the ${row.label} first.` };
  return tooLong(text, MOST_WORDS, row.label) ?? { text };
}

/** The reason for a strike or for leaving out, in the same shape; `says` is asked where there is none. */
export function readReason(typed, says) {
  const text = typed.trim();
  return text === "" ? { says } : (tooLong(text, MOST_REASON, "The reason") ?? { text });
}

function tooLong(text, most, what) {
  const count = [...text].length;
  return count > most ? { says: `${what} takes up to ${most} characters; this has ${count}. Shorten it.` } : null;
}

/** The unit of a row or reading as people write it; empty where there is none. */
export function unitOf({ unit }) {
  return unit === "Cel" ? "°C" : (unit ?? "");
}

function decimalsSay(text, row) {
  if (row.decimals === null || row.decimals === undefined) return null;
  const count = decimalsOf(text);
  if (count < row.decimals) {
    return `Type all digits shown, including final zeros: ${row.decimals} after the point, for example ${exampleFor(row)}.`;
  }
  if (count > row.decimals) {
    return `${text} has ${count} digits after the point; the instrument shows ${row.decimals}, for example ${exampleFor(row)}.`;
  }
  return null;
}

function signSays(text, row) {
  if (!text.startsWith("-") || row.signed) return null;
  return `${row.label} cannot be negative. Type it without the minus, for example ${exampleFor(row)}.`;
}

/** -1, 0 or 1: two decimal texts compared digit by digit, so that no float rounds them. */
export function compare(left, right) {
  const [a, b] = [scaled(left, right), scaled(right, left)];
  return a < b ? -1 : a > b ? 1 : 0;
}

function scaled(text, other) {
  const places = Math.max(decimalsOf(text), decimalsOf(other));
  const [whole, part = ""] = text.replace("\u2212", "-").split(/[.,]/);
  return BigInt(whole + part.padEnd(places, "0"));
}
