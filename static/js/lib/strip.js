// The words of the strip: what is kept where, and how far the sheet has come.

/** "1 entry", "2 entries". */
export function entries(count) {
  return count === 1 ? "1 entry" : `${count} entries`;
}

/** Where the entries are, in one sentence; empty while all of them are on the server. */
export function networkSays({ waiting, refused, state, detail, stored = true }) {
  const asks = refused > 0 ? `${entries(refused)} not taken: see the row.` : "";
  if (waiting === 0) return asks;
  const wait = waiting === 1 ? "waits" : "wait";
  const kept = stored
    ? `${entries(waiting)} ${wait} on this tablet, nothing is lost.`
    : `${entries(waiting)} ${wait} in this page alone, for this browser stores nothing: keep it open.`;
  const says = {
    sending: `Sending ${entries(waiting)}.`,
    offline: `No network: ${kept}`,
    "signed out": `You are signed out: ${kept} Sign in again to send.`,
    trouble: `${detail || "The server did not take them"}. ${kept}`.replace("..", "."),
  }[state];
  return [says ?? kept, asks].filter(Boolean).join(" ");
}

/** How many replicates are still wanted, in few words. */
export function toGo(margin) {
  if (margin.to_go === 0) return "all written";
  const some = margin.replicates.some((one) => one.value !== null);
  return some ? `${margin.to_go} to go` : `${margin.to_go} ${margin.to_go === 1 ? "replicate" : "replicates"} to go`;
}

/** The parts of the one-line strip, most needed first: those that find no room are left out. */
export function lineParts(margin) {
  const part = (term, value) => (value ? [{ term, value }] : []);
  const last = margin.replicates.filter((one) => one.value !== null && !one.excluded).reverse();
  return [
    ...part("mean", margin.mean),
    ...part("spread", margin.spread),
    { term: "", value: toGo(margin) },
    ...last.map((one) => ({ term: `no. ${one.label}`, value: one.value })),
  ];
}
