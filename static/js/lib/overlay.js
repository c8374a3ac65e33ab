// The sheet as it stands on this tablet: the server's rows with the entries that still wait laid over.

export const SERVER = "on the server";
export const TABLET = "on this tablet";

/** What is written to let a replicate that was left out count again. */
export const COUNTS_AGAIN = "counts again";

/** The row in which another method than the recipe's is taken; it asks for the reason. */
export const METHOD_SLOT = "end_point_method";

/** The name of a row inside its sheet. */
export function keyOf(row) {
  return `${row.replicate}/${row.slot}/${row.segment}`;
}

/**
 * The groups of rows to draw. `kept` are this tablet's entries in the order of their device
 * sequence, `opened` the segments opened here as `replicate/segment`.
 */
export function layOver(sheet, kept, opened) {
  const groups = sheet.groups.map((group) => ({
    ...group,
    excludedWhere: group.excluded ? SERVER : null,
    rows: group.rows.map((row) => ({ ...row, where: row.value ? SERVER : null, refused: null })),
  }));
  for (const name of opened) openSegment(groups, ...name.split("/").map(Number));
  const known = idsOf(sheet);
  for (const entry of kept) {
    if (!known.has(entry.id)) layEntry(groups, entry);
  }
  return groups;
}

/** All rows in the order of the work. */
export function rowsOf(groups) {
  return groups.flatMap((group) => group.rows);
}

/** The row that is next: the server's word while nothing waits, else the first that is missing. */
export function nextOf(groups, sheet, waiting) {
  const open = groups
    .filter((group) => !group.excluded)
    .flatMap((group) => group.rows)
    .filter((row) => row.required && row.value === null);
  if (waiting === 0 && sheet.next) {
    const named = open.find((row) => keyOf(row) === keyOf(sheet.next));
    if (named && !open.some((row) => row.local)) return named;
  }
  return open[0] ?? null;
}

function idsOf(sheet) {
  const ids = new Set();
  for (const row of rowsOf(sheet.groups)) {
    if (row.value) ids.add(row.value.id);
    for (const struck of row.struck) ids.add(struck.entry.id);
  }
  return ids;
}

function openSegment(groups, replicate, segment) {
  const group = groups.find((other) => other.replicate === replicate);
  if (!group) return;
  for (const slot of ["burette_start", "burette_end"]) {
    const first = group.rows.find((row) => row.slot === slot && row.segment === 1);
    const there = group.rows.some((row) => row.slot === slot && row.segment === segment);
    if (!first || there) continue;
    const label = `${first.label}, filling ${segment}`;
    const row = { ...first, segment, label, value: null, struck: [], where: null, local: true };
    group.rows.splice(placeAfterBurette(group.rows), 0, { ...row, required: true, refused: null });
  }
}

function placeAfterBurette(rows) {
  return rows.findLastIndex((row) => row.slot.startsWith("burette_")) + 1;
}

function layEntry(groups, entry) {
  const group = groups.find((other) => other.replicate === entry.replicate);
  if (!group) return;
  if (entry.segment > 1) openSegment(groups, entry.replicate, entry.segment);
  const row = group.rows.find((other) => keyOf(other) === keyOf(entry));
  if (!row) return;
  if (entry.state === "refused") {
    row.refused = { id: entry.id, text: entry.raw ?? entry.text, problem: entry.problem, ...(entry.curve ? { curve: entry.curve } : {}) };
    return;
  }
  if (row.value && entry.strikes === row.value.id) row.struck = [...row.struck, struckBy(row.value, entry)];
  row.value = viewOf(entry);
  row.where = TABLET;
  row.refused = null;
  if (row.slot === "excluded") {
    group.excluded = entry.text === COUNTS_AGAIN ? null : `${entry.text}: ${entry.reason}`;
    group.excludedWhere = TABLET;
  }
}

function viewOf(entry) {
  const { id, text, unit, raw, initials, clock, device_at: at, reason } = entry;
  return { id, text, unit, raw, initials, person: "", at, clock, late: false, reason };
}

function struckBy(value, entry) {
  return {
    entry: value,
    struck_by: entry.initials,
    struck_clock: entry.clock,
    struck_at: entry.device_at,
    reason: entry.reason ?? "",
  };
}
