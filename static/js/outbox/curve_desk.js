// What was chosen for a curve's row: kept on this tablet, shown to the server, never lost meanwhile.

import { MOST_KEPT, chosenFile, chosenFrom, chosenText, forPreview, tooLarge } from "../lib/curve.js";
import { keyOf } from "../lib/overlay.js";
import { postJson } from "./asking.js";

const PATIENCE_MS = 30000;

/** The desk of a sheet's curves. `onChange(words)` redraws and says. */
export class CurveDesk {
  constructor({ store, address, person, fetcher, onChange }) {
    Object.assign(this, { store, address, person, fetcher, onChange });
    this.told = new Map();
    this.loose = new Map();
    this.asked = 0;
  }

  /** How a row's curve stands: `{chosen, state, preview, problem}`; a kept choice is looked at anew. */
  of(row) {
    const key = keyOf(row);
    const told = this.told.get(key);
    if (told) return told;
    const chosen = this.loose.get(key) ?? chosenFrom(this.store.drafts()[key]) ?? row.refused?.curve ?? null;
    const made = { chosen, state: chosen ? "kept" : "idle", preview: null, problem: row.refused?.problem ?? null };
    this.told.set(key, made);
    if (chosen && !row.refused) queueMicrotask(() => this.look(row));
    return made;
  }

  /** A file was dropped or chosen. */
  async file(row, file) {
    const says = tooLarge(file.size);
    if (says) return this.#become(row, { chosen: null, state: "refused", problem: { detail: says } }, says);
    const bytes = new Uint8Array(await file.arrayBuffer());
    return this.take(row, chosenFile(file.name, bytes));
  }

  /** Text was pasted, or typed and to be looked at. */
  text(row, text) {
    if (text.trim()) return this.take(row, chosenText(text));
    return this.#become(row, { chosen: null, state: "idle", problem: { detail: "Paste two columns first: volume, then pH or mV.", example: "0.00; 4.01" } });
  }

  /** Half-typed text is kept as it stands, so that a reload loses nothing. */
  typing(row, text) {
    this.store.draft(keyOf(row), text);
  }

  take(row, chosen) {
    this.#keep(row, chosen);
    this.told.set(keyOf(row), { chosen, state: "kept", preview: null, problem: null });
    return this.look(row);
  }

  /** The same original, read in another way. */
  change(row, more) {
    return this.take(row, { ...this.of(row).chosen, ...more });
  }

  forget(row) {
    if (!row) return;
    const key = keyOf(row);
    this.asked += 1;
    this.told.delete(key);
    this.loose.delete(key);
    if (row.kind === "curve") this.store.draft(key, "");
  }

  /** Ask the server how it reads what was chosen; nothing is stored there. */
  async look(row) {
    const { chosen } = this.of(row);
    if (!chosen) return;
    const turn = ++this.asked;
    this.#become(row, { chosen, state: "reading", preview: null, problem: null });
    const answer = await this.#ask(forPreview(chosen, row.replicate));
    if (turn !== this.asked) return;
    if (answer.preview) {
      const { preview } = answer;
      this.#become(row, { chosen, state: "shown", preview, problem: null }, `${preview.text}. Look at it, then write it.`);
    } else if (answer.status === 422 || answer.status === 413) {
      this.#become(row, { chosen, state: "refused", preview: null, problem: answer.problem }, answer.problem.detail);
    } else {
      const detail = this.#waits(row, answer);
      this.#become(row, { chosen, state: "offline", preview: null, problem: { detail } }, detail);
    }
  }

  #waits(row, { status, problem }) {
    const kept = this.loose.has(keyOf(row))
      ? "It is too large to be kept on this tablet: leave this page open, or choose the file again later."
      : "What you chose is kept on this tablet, nothing is lost.";
    if (status === 401) return `You are signed out. ${kept} Sign in again, then look at it.`;
    if (status === 0) return `No network: a curve is looked at on the server before it is written. ${kept}`;
    return `${problem.detail ?? "The server could not look at it."} ${kept}`;
  }

  #keep(row, chosen) {
    const key = keyOf(row);
    const text = JSON.stringify(chosen);
    this.loose.delete(key);
    this.store.draft(key, "");
    if (text.length <= MOST_KEPT) this.store.draft(key, text);
    if (this.store.drafts()[key] !== text) this.loose.set(key, chosen);
  }

  async #ask(body) {
    const { ok, status, said } = await postJson(this, this.address, body, PATIENCE_MS);
    return ok && said.mapping ? { preview: said } : { status, problem: said };
  }

  #become(row, told, words = "") {
    this.told.set(keyOf(row), { preview: null, problem: null, ...told });
    this.onChange(words);
  }
}
