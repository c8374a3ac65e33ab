// One way to the server for what a tablet writes: never throws, answers what was said.

/** Post JSON: `{ok, status, said}`; status 0 where nobody answered within `patience` ms. */
export async function postJson({ fetcher, person }, address, body, patience) {
  try {
    const answer = await fetcher(address, {
      method: "POST",
      credentials: "same-origin",
      headers: {
        Accept: "application/json",
        "Content-Type": "application/json",
        "X-Titrant-Ledger": "bench",
        ...(person ? { "X-Titrant-Person": encodeURIComponent(person) } : {}),
      },
      body: JSON.stringify(body),
      signal: AbortSignal.timeout(patience),
    });
    return { ok: answer.ok, status: answer.status, said: await answer.json().catch(() => ({})) };
  } catch {
    return { ok: false, status: 0, said: {} };
  }
}
