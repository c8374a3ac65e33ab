// Sheets, rows and entries for the tests, in the shape of the sheet's JSON.

export function valueOf(id, text) {
  return { id, text, unit: "mL", raw: null, initials: "BO", person: "Bashir Oduya", at: "", clock: "09:12", late: false, reason: null };
}

export function rowOf(slot, more = {}) {
  return {
    replicate: 1, slot, segment: 1, label: slot, unit: "mL", hint: "", kind: "number", decimals: 2, signed: false,
    required: true, choices: [], low: null, high: null, usual_low: null, usual_high: null, value: null, struck: [],
    ...more,
  };
}

export function groupOf(replicate, rows, more = {}) {
  return { replicate, title: `Replicate ${replicate}`, excluded: null, rows, ...more };
}

export function sheetOf(groups, next = null) {
  return { groups, next, revision: 7 };
}

export function entryOf(id, slot, text, more = {}) {
  return {
    id, replicate: 1, slot, segment: 1, text, unit: "mL", raw: null, strikes: null, reason: null, initials: "IT",
    state: "waiting", problem: null, clock: "09:15", device_at: "2026-05-04T07:15:00.000Z", device_sequence: 1, ...more,
  };
}

/** A browser's storage; with `room` it takes no more than so many letters. */
export class Storage {
  constructor(room = Infinity) {
    this.kept = new Map();
    this.room = room;
  }

  get length() {
    return this.kept.size;
  }

  key(place) {
    return [...this.kept.keys()][place] ?? null;
  }

  getItem(key) {
    return this.kept.get(key) ?? null;
  }

  setItem(key, value) {
    if (String(value).length > this.room) throw new Error("QuotaExceededError");
    this.kept.set(key, String(value));
  }

  removeItem(key) {
    this.kept.delete(key);
  }
}
