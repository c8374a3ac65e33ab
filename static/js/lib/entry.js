// One entry as it goes through the door, with what only this tablet knows about it.

/** The fields that the door takes; what else is kept with an entry stays on the tablet. */
const SENT = [
  "id", "replicate", "slot", "segment", "text", "unit", "raw", "strikes", "reason", "device_id",
  "device_sequence", "device_at", "device_zone", "monotonic_ms", "base_revision",
];

/** A new entry for a row; `stamp` holds uuid, device, sequence and clocks. */
export function newEntry(row, reading, { strikes = null, reason = null, initials, stamp }) {
  const { replicate, slot, segment } = row;
  const { text, unit = null, raw = null, curve = null } = reading;
  return {
    replicate, slot, segment, text, unit, raw, curve, strikes, reason, initials, state: "waiting", problem: null,
    ...stamp,
  };
}

/** The entry as the door takes it. */
export function forTheDoor(entry) {
  const sent = Object.fromEntries(SENT.map((name) => [name, entry[name] ?? null]));
  return entry.curve ? { ...sent, curve: entry.curve } : sent;
}

/** The hour and minute of an instant on this tablet's clock. */
export function clockOf(date) {
  const two = (number) => String(number).padStart(2, "0");
  return `${two(date.getHours())}:${two(date.getMinutes())}`;
}
