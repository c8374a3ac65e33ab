// What a row asks before it takes an odd value. The server decides in the end; this asks first.

import { compare, unitOf } from "./reading.js";

const AGAIN = { key: "again", label: "Type again" };
const ANYWAY = { key: "anyway", label: "It is right, write it" };
const SEGMENT = { key: "segment", label: "Refilled: add a segment" };

/** The question that this reading raises in its row, as `{says, answers}`, or null. */
export function questionFor(row, reading, rows) {
  return (
    belowStart(row, reading, rows) ??
    heavierAfterwards(row, reading, rows) ??
    unsettled(reading) ??
    unusual(row, reading)
  );
}

function valueOf(rows, slot, row) {
  const found = rows.find(
    (other) =>
      other.slot === slot && other.replicate === row.replicate && other.segment === row.segment,
  );
  return found?.value?.text ?? null;
}

function belowStart(row, reading, rows) {
  if (row.slot !== "burette_end") return null;
  const start = valueOf(rows, "burette_start", row);
  if (start === null || compare(reading.text, start) >= 0) return null;
  return {
    says: `${reading.text} ${row.unit} is less than the start, ${start} ${row.unit}. Refilled?`,
    answers: [SEGMENT, AGAIN],
  };
}

function heavierAfterwards(row, reading, rows) {
  if (row.slot !== "container_less_standard") return null;
  const before = valueOf(rows, "container_and_standard", row);
  if (before === null || compare(reading.text, before) < 0) return null;
  return {
    says: `${reading.text} ${row.unit} is not less than before, ${before} ${row.unit}: nothing would have been weighed out.`,
    answers: [AGAIN],
  };
}

function unsettled(reading) {
  if (reading.settled !== false) return null;
  return {
    says: `The line does not say that ${reading.text} has settled.`,
    answers: [AGAIN, ANYWAY],
  };
}

/** `low` and `high` are what is possible at all, the usual bounds what is asked about. */
function unusual(row, reading) {
  return (
    outside(row, reading, [row.low, row.high], [AGAIN]) ??
    outside(row, reading, [row.usual_low, row.usual_high], [AGAIN, ANYWAY])
  );
}

function outside(row, reading, [low, high], answers) {
  const under = stated(low) && compare(reading.text, low) < 0;
  const over = stated(high) && compare(reading.text, high) > 0;
  if (!under && !over) return null;
  const unit = row.unit ? ` ${unitOf(row)}` : "";
  const bound = under ? `less than ${low}${unit}` : `more than ${high}${unit}`;
  const usual = answers.length > 1 ? "unusual: it is" : "not possible here: it is";
  return { says: `${reading.text}${unit} is ${usual} ${bound}.`, answers };
}

function stated(bound) {
  return bound !== null && bound !== undefined;
}
