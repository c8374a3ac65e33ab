// What a key of the number pad does to the text in the row.

const LONGEST = 32;

/** The text after a key: a digit, "." , "±" or "back". */
export function press(text, key) {
  if (key === "back") return text.slice(0, -1);
  if (key === "±") return text.startsWith("-") ? text.slice(1) : `-${text}`;
  if (text.length >= LONGEST) return text;
  if (key === ".") return /[.,]/.test(text) ? text : `${/\d$/.test(text) ? text : `${text}0`}.`;
  return text + key;
}
