// A curve on its way to its row: what was chosen, how it travels, what is asked about it.

export const MOST_BYTES = 5_000_000;
/** So much of a file this tablet keeps for a row; more is kept only while the page is open. */
export const MOST_KEPT = 1_500_000;

const LETTERS = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";

/** What a column can hold, as the select offers it: its value and its words. */
export const ROLES = [
  ["", "not used"],
  ["volume/mL", "volume, mL"],
  ["volume/µL", "volume, µL"],
  ["volume/L", "volume, L"],
  ["volume/drops", "volume, drops counted"],
  ["reading/pH", "pH"],
  ["reading/mV", "mV"],
  ["reading/V", "V"],
  ["time/s", "time, s"],
  ["time/min", "time, min"],
  ["time/h", "time, h"],
];

/** Bytes as base64 text. */
export function base64Of(bytes) {
  let text = "";
  for (let at = 0; at < bytes.length; at += 3) {
    const [a, b, c] = [bytes[at], bytes[at + 1], bytes[at + 2]];
    text += LETTERS[a >> 2] + LETTERS[((a & 3) << 4) | ((b ?? 0) >> 4)];
    text += b === undefined ? "=" : LETTERS[((b & 15) << 2) | ((c ?? 0) >> 6)];
    text += c === undefined ? "=" : LETTERS[c & 63];
  }
  return text;
}

/** What was chosen: a file by its name and bytes. */
export function chosenFile(name, bytes) {
  return { file_name: name, content_base64: base64Of(bytes) };
}

/** What was chosen: text that was pasted or typed. */
export function chosenText(text) {
  return { pasted: text };
}

/** The draft of a row as it was kept: what was chosen; text of another kind is text pasted. */
export function chosenFrom(draft) {
  if (!draft) return null;
  try {
    const kept = JSON.parse(draft);
    return kept && typeof kept === "object" && ("pasted" in kept || "content_base64" in kept) ? kept : chosenText(draft);
  } catch {
    return chosenText(draft);
  }
}

/** Why a file is not even sent, or null. */
export function tooLarge(size) {
  if (size <= MOST_BYTES) return null;
  return `The file has ${(size / 1e6).toFixed(1)} MB; at most ${MOST_BYTES / 1e6} MB are read. Export the curve alone.`;
}

/** The body of a preview. */
export function forPreview(chosen, replicate) {
  return { replicate, ...sentOf(chosen) };
}

/** The curve as the door takes it: read again there in just the way that was shown. */
export function sentOf(chosen) {
  const sent = {};
  for (const name of ["file_name", "content_base64", "pasted", "mapping", "sheet", "drop_mL", "drop_u_mL"]) {
    const value = chosen[name];
    if (value === "" && name === "content_base64") sent[name] = value; // an empty file is told to be one
    else if (value !== undefined && value !== null && value !== "") sent[name] = name.startsWith("drop") ? value.trim().replace(",", ".") : value;
  }
  if (chosen.leave_out?.length) sent.leave_out = chosen.leave_out;
  return sent;
}

/** Which role each column has: by the preview's columns, or by a mapping. */
export function rolesOf(mapping, width) {
  const roles = Array.from({ length: width }, () => "");
  if (!mapping) return roles;
  roles[mapping.volume] = `volume/${mapping.volume_unit ?? "mL"}`;
  roles[mapping.reading] = `reading/${mapping.reading_unit ?? mapping.kind}`;
  if (mapping.time !== null && mapping.time !== undefined) roles[mapping.time] = `time/${mapping.time_unit ?? "s"}`;
  return roles;
}

/** Roles after one column was given another: a role stands once, the newest counts. */
export function withRole(roles, at, role) {
  const kind = role.split("/")[0];
  return roles.map((old, place) => (place === at ? role : kind && old.split("/")[0] === kind ? "" : old));
}

/** The mapping that roles make, or `{says}` what is missing. */
export function mappingOf(roles) {
  const found = {};
  roles.forEach((role, at) => {
    const [kind, unit] = role.split("/");
    if (kind) found[kind] = { at, unit };
  });
  if (!found.volume) return { says: "Say which column is the volume." };
  if (!found.reading) return { says: "Say which column is the pH or the mV." };
  const kind = found.reading.unit === "pH" ? "pH" : "mV";
  const mapping = {
    volume: found.volume.at, volume_unit: found.volume.unit, reading: found.reading.at, reading_unit: found.reading.unit, kind,
  };
  return found.time ? { ...mapping, time: found.time.at, time_unit: found.time.unit } : mapping;
}

/** What can be done about a refusal of the table. */
export function remedyOf(problem) {
  const shown = problem.shown ?? {};
  return {
    row: problem.field === "file" && Number.isInteger(shown.row) && shown.row > 0 ? shown.row : null,
    table: shown.table ?? null,
    mapping: shown.mapping ?? null,
    drop: problem.field === "drop_mL" || problem.field === "drop_u_mL",
    sheet: problem.field === "sheet",
  };
}
