// The one selection that every plot and the table share: rows on or off, told once a frame.

export class Selection {
  constructor(count) {
    this.on = new Uint8Array(count);
    this.count = 0;
    this.listeners = new Set();
    this.waiting = false;
  }

  has(row) { return this.on[row] === 1; }

  /** The selected rows in order. */
  rows() {
    const found = new Int32Array(this.count);
    let n = 0;
    for (let row = 0; row < this.on.length; row += 1) if (this.on[row]) found[n++] = row;
    return found;
  }

  /** `mode`: "replace", "add", "remove" or "toggle". */
  apply(rows, mode = "replace") {
    if (mode === "replace") this.on.fill(0);
    for (const row of rows) this.on[row] = mode === "remove" ? 0 : mode === "toggle" ? 1 - this.on[row] : 1;
    this.#recount();
    this.#tell();
  }

  clear() { this.apply([], "replace"); }

  subscribe(listener) { this.listeners.add(listener); }

  #recount() {
    let count = 0;
    for (const flag of this.on) count += flag;
    this.count = count;
  }

  #tell() {
    if (this.waiting) return;
    this.waiting = true;
    requestAnimationFrame(() => {
      this.waiting = false;
      for (const listener of this.listeners) listener(this);
    });
  }
}

/** Which mode the keys held with a gesture ask for. */
export function modeOf(event) {
  if (event.shiftKey) return "add";
  return event.altKey ? "remove" : "replace";
}
