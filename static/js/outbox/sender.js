// Sends what waits, in order, under the uuids it was written with, until the server has answered.

import { forTheDoor } from "../lib/entry.js";
import { postJson } from "./asking.js";

const PATIENCE_MS = 15000;
const REFUSED = new Set([400, 404, 409, 412, 413, 415, 422]);

/** One sender for one sheet. `door` is the address, `onChange(sheet or null)` redraws. */
export class Sender {
  constructor({ store, door, person, fetcher, onChange }) {
    Object.assign(this, { store, door, person, fetcher, onChange });
    this.state = "idle";
    this.detail = "";
    this.busy = false;
    this.again = false;
  }

  /** Send all that waits; a call that comes meanwhile makes it look once more. */
  async flush() {
    if (this.busy) {
      this.again = true;
      return;
    }
    this.busy = true;
    try {
      do {
        this.again = false;
        await this.#round();
      } while (this.again);
    } finally {
      this.busy = false;
    }
  }

  /** A refused batch is sent one by one, so that one odd entry holds none of the others back. */
  async #round() {
    let single = false;
    for (let batch = this.store.waiting(); batch.length > 0; batch = this.store.waiting()) {
      this.#become("sending", "");
      const sent = single ? batch.slice(0, 1) : batch;
      const answer = await this.#post(sent);
      if (answer.written) {
        const ids = new Set(answer.written.map((one) => one.id));
        const taken = sent.filter((entry) => ids.has(entry.id));
        if (taken.length === 0) return this.#become("trouble", "");
        for (const entry of taken) this.store.drop(entry.id);
        this.#become("idle", "", answer.sheet);
      } else if (REFUSED.has(answer.status) && sent.length > 1) {
        single = true;
      } else if (REFUSED.has(answer.status)) {
        this.store.refuse(sent[0].id, answer.problem);
        this.#become("idle", "", answer.status === 409 ? await this.#sheet() : null);
      } else {
        return this.#become(stateFor(answer.status), answer.problem.detail ?? "");
      }
    }
    return this.#become("idle", "");
  }

  async #post(entries) {
    const body = { entries: entries.map(forTheDoor), sent_at: new Date().toISOString() };
    const { ok, status, said } = await postJson(this, this.door, body, PATIENCE_MS);
    return ok && said.written ? said : { status, problem: said };
  }

  /** The sheet as the server has it now: somebody else was first, and both values are to be seen. */
  async #sheet() {
    try {
      const headers = { Accept: "application/json" };
      const answer = await this.fetcher(this.door.replace(/\/entries$/, ""), { credentials: "same-origin", headers });
      return answer.ok ? await answer.json() : null;
    } catch {
      return null;
    }
  }

  #become(state, detail, sheet = null) {
    this.state = state;
    this.detail = detail;
    this.onChange(sheet);
  }
}

function stateFor(status) {
  if (status === 0) return "offline";
  return status === 401 ? "signed out" : "trouble";
}
