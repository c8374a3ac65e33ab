// What a label's code says: the address behind it, or the bare code. Free of the DOM.

const ALPHABET = "0123456789ABCDEFGHJKMNPQRSTWXYZ";
const WEIGHTS = [8, 7, 6, 5, 4, 3, 2, 1];

/** Say whether a code in upper case has the right characters and check. */
export function holds(code) {
  if (code.length !== WEIGHTS.length) return false;
  let sum = 0;
  for (let i = 0; i < code.length; i += 1) {
    const value = ALPHABET.indexOf(code[i]);
    if (value < 0) return false;
    sum += WEIGHTS[i] * value;
  }
  return sum % ALPHABET.length === 0;
}

/** Return the code of a bottle in what was scanned, or null where it is something else. */
export function codeIn(text) {
  const address = /\/b\/([0-9a-z]{8})\/?(?:[?#].*)?$/i.exec(text.trim());
  const code = (address ? address[1] : text.trim()).toUpperCase();
  return holds(code) ? code : null;
}
