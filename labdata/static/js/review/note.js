// The small note beside the pointer: which sample, which values, how they stand. The table says the same in text.

export class Note {
  constructor(element, model) { Object.assign(this, { element, model }); }

  show(hit) {
    this.element.hidden = !hit;
    if (!hit) return;
    const model = this.model(), { rows } = model, row = hit.row;
    const values = hit.columns.map((column) => {
      const current = model.byKey.get(column.key) ?? column;
      const state = model.figures.markers[model.stateName(current, row)];
      return `${current.label} ${model.shown(current, row)} ${current.unit}${state ? ` ${state.sign} ${state.label}` : ""}`;
    });
    this.element.textContent = [`${model.name(row)} · ${rows.kind[row]} · ${depths(rows, row)}${rows.formation[row] ? ` · ${rows.formation[row]}` : ""}`, ...values].join("\n");
    this.#place(hit);
  }

  #place({ x, y, box }) {
    const outer = this.element.offsetParent.getBoundingClientRect(), inner = box.getBoundingClientRect();
    const left = inner.left - outer.left + x + 12, top = inner.top - outer.top + y + 12;
    this.element.style.left = `${Math.max(0, Math.min(left, outer.width - this.element.offsetWidth - 4))}px`;
    this.element.style.top = `${top}px`;
  }
}

function depths({ top, base }, row) {
  if (top[row] === null) return "depth unknown";
  return base[row] === null || base[row] === top[row] ? `${top[row]} m` : `${top[row]}–${base[row]} m`;
}
