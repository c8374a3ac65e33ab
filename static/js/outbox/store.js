// What this tablet keeps until the server has it. Every entry has a key of its own, so that two
// open pages never overwrite each other; keys carry person and sheet, so that nobody sends another's.

const ROOM = "titrant-ledger";

/** The keeper of one person's entries on one sheet. */
export class Store {
  constructor({ storage, person, sheet }) {
    this.storage = storage;
    this.prefix = `${ROOM}/unsent/${person}/${sheet}/`;
    this.draftKey = `${ROOM}/draft/${person}/${sheet}`;
    this.openedKey = `${ROOM}/opened/${person}/${sheet}`;
    this.loose = new Map();
  }

  /** All kept entries in the order in which they were written. */
  all() {
    const kept = new Map(this.loose);
    for (const key of keysOf(this.storage)) {
      if (!key.startsWith(this.prefix)) continue;
      const entry = read(this.storage, key);
      if (entry) kept.set(entry.id, entry);
    }
    return [...kept.values()].sort((a, b) => a.device_sequence - b.device_sequence);
  }

  waiting() {
    return this.all().filter((entry) => entry.state === "waiting");
  }

  refused() {
    return this.all().filter((entry) => entry.state === "refused");
  }

  /** Keep an entry; false where the browser would not (it is then kept while the page is open). */
  keep(entry) {
    const kept = write(this.storage, this.prefix + entry.id, entry);
    if (kept) this.loose.delete(entry.id);
    else this.loose.set(entry.id, entry);
    return kept;
  }

  /** Whether all that waits would outlive this page. */
  isSafe() {
    return this.loose.size === 0;
  }

  refuse(id, problem) {
    const entry = this.all().find((one) => one.id === id);
    if (entry) this.keep({ ...entry, state: "refused", problem });
  }

  drop(id) {
    this.loose.delete(id);
    this.storage?.removeItem(this.prefix + id);
  }

  drafts() {
    return read(this.storage, this.draftKey) ?? {};
  }

  /** Keep what stands half-typed in a row, so that a reload loses no digit. */
  draft(key, text) {
    const drafts = this.drafts();
    if (text) drafts[key] = text;
    else delete drafts[key];
    write(this.storage, this.draftKey, drafts);
  }

  opened() {
    return read(this.storage, this.openedKey) ?? [];
  }

  open(replicate, segment) {
    const name = `${replicate}/${segment}`;
    write(this.storage, this.openedKey, [...new Set([...this.opened(), name])]);
  }

  /** This browser's own name, made once. */
  device(newId) {
    const kept = read(this.storage, `${ROOM}/device`);
    if (kept) return kept;
    const made = newId();
    write(this.storage, `${ROOM}/device`, made);
    return made;
  }

  /** The next number of this device's own count. */
  sequence() {
    const next = (read(this.storage, `${ROOM}/sequence`) ?? this.lastLoose()) + 1;
    write(this.storage, `${ROOM}/sequence`, next);
    this.last = next;
    return next;
  }

  lastLoose() {
    return this.last ?? 0;
  }
}

/** Sheets of a person with entries that wait on this tablet: `[{sheet, count}]`. */
export function sheetsWaiting(storage, person) {
  const prefix = `${ROOM}/unsent/${person}/`;
  const counts = new Map();
  for (const key of keysOf(storage)) {
    if (!key.startsWith(prefix)) continue;
    const sheet = key.slice(prefix.length).split("/")[0];
    counts.set(sheet, (counts.get(sheet) ?? 0) + 1);
  }
  return [...counts].map(([sheet, count]) => ({ sheet, count }));
}

function keysOf(storage) {
  if (!storage) return [];
  return Array.from({ length: storage.length }, (_, place) => storage.key(place));
}

function read(storage, key) {
  try {
    return JSON.parse(storage.getItem(key));
  } catch {
    return null;
  }
}

function write(storage, key, value) {
  try {
    storage.setItem(key, JSON.stringify(value));
    return true;
  } catch {
    return false;
  }
}
