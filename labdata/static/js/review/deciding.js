// The decision bar: which verdict, on which analytes of the selection, with which reason.

import { make, plural } from "./dom.js";

const DO = { accepted: "Accept", rejected: "Reject", held: "Hold" };

export class DecisionBar {
  /** `form`: the bar; `send(name, body)` posts and reloads. */
  constructor(form, model, selection, send) {
    Object.assign(this, { form, model, selection, send, chosen: new Set() });
    this.chips = form.querySelector("[data-chips]");
    this.apply = form.querySelector("[data-apply]");
    this.reason = form.elements.reason;
    form.addEventListener("submit", (event) => { event.preventDefault(); this.#submit(); });
    form.addEventListener("change", () => this.refresh());
    form.querySelector("[data-all]").addEventListener("click", () => this.choose(null));
    form.querySelector("[data-accept-all]")?.addEventListener("click", () => send("accept", {}));
    form.querySelector("[data-undo]")?.addEventListener("click", () => send("undo", { batch: this.model.data.last_batch }));
    selection.subscribe(() => this.refresh());
    this.update(model, true);
  }

  update(model, fresh = false) {
    const known = new Set(this.model.measured().map((column) => column.key));
    const all = fresh || this.chosen.size === known.size;
    this.model = model;
    this.#makeChips();
    this.choose(all ? null : [...this.chosen].filter((key) => model.byKey.has(key)));
    const undo = this.form.querySelector("[data-undo]");
    if (undo) undo.disabled = !model.data.last_batch;
  }

  #makeChips() {
    const press = (key) => {
      const all = this.chosen.size === this.model.measured().length;
      const next = all ? new Set([key]) : new Set(this.chosen);
      if (!all) { if (next.has(key)) next.delete(key); else next.add(key); }
      this.choose(next.size ? [...next] : null);
    };
    this.chips.replaceChildren(...this.model.measured().map((column) =>
      make("button", { type: "button", class: "chip", "data-key": column.key, onclick: () => press(column.key) }, column.label)));
  }

  /** Which analytes the verdict is on; null means all of them. */
  choose(keys) {
    this.chosen = new Set(keys ?? this.model.measured().map((column) => column.key));
    for (const chip of this.chips.children) chip.setAttribute("aria-pressed", String(this.chosen.has(chip.dataset.key)));
    this.refresh();
  }

  results() { return this.model.results(this.selection.rows(), this.chosen); }

  refresh() {
    const verdict = this.form.elements.verdict.value, count = this.results().length;
    this.apply.textContent = `${DO[verdict]} ${plural(count, "result")}`;
    this.apply.disabled = !count;
    this.form.dataset.verdict = verdict;
    this.reason.required = verdict !== "accepted";
    this.form.elements.text.required = this.reason.value === "other";
    this.form.querySelector("[data-selected]").textContent = this.selection.count ? `${plural(this.selection.count, "sample")} selected` : "Nothing selected";
  }

  /** A verdict by keyboard: set it and go where the reason is given. */
  ask(verdict) {
    this.form.elements.verdict.value = verdict;
    this.refresh();
    (verdict === "accepted" ? this.apply : this.reason).focus();
  }

  async #submit() {
    const { verdict, reason, text } = this.form.elements;
    const done = await this.send("decide", { results: this.results(), verdict: verdict.value, reason: reason.value, text: text.value });
    if (done) { text.value = ""; reason.value = ""; this.refresh(); }
  }
}
