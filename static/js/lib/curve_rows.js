// Which curves stand in the rows of a sheet. Free of the page.

/** The replicates whose curve is on the server, in order; `written` are rows with key and text. */
export function curvesIn(written) {
  return written
    .filter((row) => row.kept && row.key.split("/")[1] === "curve")
    .map((row) => Number(row.key.split("/")[0]))
    .sort((a, b) => a - b);
}

/** A word that changes when something that bears on a curve has changed on the server. */
export function signatureOf(written) {
  if (curvesIn(written).length === 0) return "";
  return JSON.stringify(written.filter((row) => row.kept).map((row) => [row.key, row.text]));
}
