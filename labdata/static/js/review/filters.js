// Narrowing the table by numeric ranges and by state: the equal path to a selection for keyboard and screen reader.

import { make } from "./dom.js";

export class Filters {
  constructor(form, model, table, selection) {
    Object.assign(this, { form, table });
    const { column, low, high, only } = form.elements;
    column.replaceChildren(make("option", { value: "depth" }, "Depth"), ...model.columns.map((one) => make("option", { value: one.key }, `${one.label} [${one.unit}]`)));
    form.addEventListener("submit", (event) => {
      event.preventDefault();
      if (low.value === "" && high.value === "") return;
      this.#add({ key: column.value, label: column.selectedOptions[0].textContent, low: bound(low.value, -Infinity), high: bound(high.value, Infinity) });
      low.value = high.value = "";
    });
    only.addEventListener("change", () => { table.only = only.value; table.arrange(); });
    form.querySelector("[data-select-shown]").addEventListener("click", () => selection.apply(table.shown));
  }

  #add(filter) {
    this.table.filters = [...this.table.filters.filter((one) => one.key !== filter.key), filter];
    this.#show();
  }

  #show() {
    const drop = (filter) => { this.table.filters = this.table.filters.filter((one) => one !== filter); this.#show(); };
    this.form.querySelector("[data-ranges]").replaceChildren(...this.table.filters.map((filter) =>
      make("button", { type: "button", class: "chip", "aria-label": `remove the range of ${filter.label}`, onclick: () => drop(filter) }, `${words(filter)} ✕`)));
    this.table.arrange();
  }
}

function bound(text, otherwise) { return text === "" ? otherwise : Number(text); }

function words({ label, low, high }) {
  const name = label.replace(/ \[.*/, "");
  if (low === -Infinity) return `${name} ≤ ${high}`;
  return high === Infinity ? `${name} ≥ ${low}` : `${low} ≤ ${name} ≤ ${high}`;
}
