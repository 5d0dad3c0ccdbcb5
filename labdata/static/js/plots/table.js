// The text twin of the plots: every row and value, sortable, filterable, worked by keyboard. Only the rows in sight
// are in the document.

const ROW = 24; // pixels, as in review.css
const SPARE = 8;

export class ResultTable {
  /** `scroller` holds the table; `model` the rows; `act(verdict)` asks for a decision; `aim(key)` names the column meant. */
  constructor(scroller, model, selection, { act, aim, count }) {
    Object.assign(this, { scroller, model, selection, act, aim, count });
    this.sort = { key: "depth", down: true };
    this.filters = [];
    this.only = "all";
    this.active = 0;
    this.column = 0;
    this.#build();
    this.update(model);
    selection.subscribe(() => { if (this.only === "selected") this.arrange(); else this.#paint(); });
  }

  update(model) {
    this.model = model;
    this.heads = [
      { key: "depth", label: "Depth", unit: "m", text: (row) => depthText(model, row), number: (row) => model.top[row] },
      { key: "sample", label: "Sample", text: (row) => model.name(row), word: (row) => model.rows.label[row] },
      ...model.columns.map((column) => ({ key: column.key, column, label: column.label, unit: column.computed ? "computed" : column.unit, text: (row) => model.shown(column, row), number: (row) => column.value[row] })),
      { key: "kind", label: "Kind", text: (row) => model.rows.kind[row], word: (row) => model.rows.kind[row] },
      { key: "formation", label: "Formation", text: (row) => model.rows.formation[row], word: (row) => model.rows.formation[row] },
    ];
    this.#head();
    this.arrange();
  }

  #build() {
    this.table = document.createElement("table");
    this.table.className = "twin";
    this.table.setAttribute("role", "grid");
    this.table.setAttribute("aria-multiselectable", "true");
    this.table.setAttribute("aria-label", "Results, a row a sample and replicate");
    this.table.tabIndex = 0;
    this.thead = this.table.createTHead();
    this.tbody = this.table.createTBody();
    this.scroller.replaceChildren(this.table);
    this.scroller.addEventListener("scroll", () => this.#later());
    new ResizeObserver(() => this.#later()).observe(this.scroller);
    this.table.addEventListener("keydown", (event) => this.#key(event));
    this.tbody.addEventListener("click", (event) => this.#click(event));
    this.thead.addEventListener("click", (event) => this.#sortBy(event.target.closest("button")?.dataset.key));
  }

  #head() {
    const line = document.createElement("tr");
    line.setAttribute("aria-rowindex", "1");
    for (const head of this.heads) {
      const cell = document.createElement("th"), button = document.createElement("button");
      cell.scope = "col";
      cell.setAttribute("role", "columnheader");
      cell.className = head.number ? "num" : "";
      cell.setAttribute("aria-sort", this.sort.key !== head.key ? "none" : this.sort.down ? "ascending" : "descending");
      button.type = "button"; button.dataset.key = head.key; button.tabIndex = -1; button.textContent = head.label;
      if (head.unit) { const unit = document.createElement("small"); unit.textContent = head.unit; button.append(unit); }
      cell.append(button);
      line.append(cell);
    }
    this.thead.replaceChildren(line);
  }

  #sortBy(key) {
    if (!key) return;
    this.sort = { key, down: this.sort.key === key ? !this.sort.down : true };
    this.#head();
    this.arrange();
  }

  /** Filter and sort again. `filters`: [{key, low, high}], `only`: a state, "selected" or "all". */
  arrange() {
    const { model, selection, only } = this, shown = [];
    const columns = this.filters.map((filter) => ({ ...filter, values: filter.key === "depth" ? model.middle : model.byKey.get(filter.key)?.value }));
    for (let row = 0; row < model.count; row += 1) {
      const fits = columns.every(({ values, low, high }) => values && values[row] >= low && values[row] <= high);
      if (fits && (only === "all" || (only === "selected" ? selection.has(row) : model.hasState(row, only)))) shown.push(row);
    }
    this.shown = this.#sorted(shown);
    this.active = Math.min(this.active, Math.max(0, this.shown.length - 1));
    this.table.setAttribute("aria-rowcount", String(this.shown.length + 1));
    this.count(this.shown.length, model.count);
    this.#paint();
  }

  #sorted(rows) {
    const head = this.heads.find((one) => one.key === this.sort.key) ?? this.heads[0], sign = this.sort.down ? 1 : -1;
    if (!head.number) return rows.sort((a, b) => sign * head.word(a).localeCompare(head.word(b), undefined, { numeric: true }) || a - b);
    return rows.sort((a, b) => {
      const u = head.number(a), v = head.number(b);
      if (u !== u || v !== v) return (u !== u) - (v !== v) || a - b; // blanks last, whichever way
      return sign * (u - v) || a - b;
    });
  }

  #later() {
    if (this.waiting) return;
    this.waiting = true;
    requestAnimationFrame(() => { this.waiting = false; this.#paint(); });
  }

  #paint() {
    const first = Math.max(0, Math.floor(this.scroller.scrollTop / ROW) - SPARE);
    const last = Math.min(this.shown.length, first + Math.ceil(this.scroller.clientHeight / ROW) + 2 * SPARE);
    const lines = [];
    for (let at = first; at < last; at += 1) lines.push(this.#line(at));
    this.tbody.replaceChildren(space(first), ...lines, space(this.shown.length - last));
    const line = this.shown.length ? this.tbody.querySelector(".active") : null;
    if (line) this.table.setAttribute("aria-activedescendant", line.children[this.column].id); else this.table.removeAttribute("aria-activedescendant");
  }

  #line(at) {
    const row = this.shown[at], line = document.createElement("tr"), chosen = this.selection.has(row);
    line.dataset.at = String(at);
    line.setAttribute("aria-rowindex", String(at + 2));
    line.setAttribute("aria-selected", String(chosen));
    line.className = at === this.active ? "active" : "";
    this.heads.forEach((head, n) => line.append(this.#cell(head, row, at, n)));
    return line;
  }

  #cell(head, row, at, n) {
    const cell = document.createElement("td");
    cell.id = `cell-${at}-${n}`;
    cell.setAttribute("role", "gridcell");
    if (at === this.active && n === this.column) cell.classList.add("here");
    if (head.number) cell.classList.add("num");
    cell.append(head.text(row));
    if (head.column) {
      const state = this.model.stateName(head.column, row);
      if (state) { cell.dataset.state = state; cell.prepend(sign(this.model.figures.markers[state])); }
      if (head.column.computed) cell.classList.add("computed");
    }
    return cell;
  }

  #click(event) {
    const line = event.target.closest("tr[data-at]"), cell = event.target.closest("td");
    if (!line || !cell) return;
    const at = Number(line.dataset.at), from = this.active;
    this.active = at; this.column = cell.cellIndex;
    this.#aim();
    if (event.shiftKey) this.#selectSpan(from, at, "add");
    else this.selection.apply([this.shown[at]], event.ctrlKey || event.metaKey ? "toggle" : "replace");
    this.table.focus({ preventScroll: true });
    this.#paint();
  }

  #aim() { this.aim(this.heads[this.column]?.column ?? null); }

  #selectSpan(from, to, mode) {
    const [low, high] = from < to ? [from, to] : [to, from];
    this.selection.apply(this.shown.slice(low, high + 1), mode);
  }

  #key(event) {
    if (event.target !== this.table) return;
    const page = Math.max(1, Math.floor(this.scroller.clientHeight / ROW) - 2), end = this.shown.length - 1;
    const steps = { ArrowDown: 1, ArrowUp: -1, PageDown: page, PageUp: -page, Home: -end, End: end };
    const letter = event.ctrlKey || event.metaKey || event.altKey ? "" : event.key.toLowerCase();
    const verdict = { a: "accepted", r: "rejected", h: "held" }[letter];
    if (event.key in steps) this.#step(steps[event.key], event.shiftKey);
    else if (event.key === "ArrowRight" || event.key === "ArrowLeft") this.#aside(event.key === "ArrowRight" ? 1 : -1);
    else if (event.key === " ") this.selection.apply([this.shown[this.active]].filter((row) => row !== undefined), "toggle");
    else if (event.key === "Escape") this.selection.clear();
    else if ((event.ctrlKey || event.metaKey) && event.key === "a") this.selection.apply(this.shown, "replace");
    else if (verdict) this.#ask(verdict);
    else return;
    event.preventDefault();
  }

  #step(by, extend) {
    const from = this.active;
    this.active = Math.min(this.shown.length - 1, Math.max(0, this.active + by));
    if (extend) this.#selectSpan(from, this.active, "add");
    this.#show();
  }

  #aside(by) {
    this.column = Math.min(this.heads.length - 1, Math.max(0, this.column + by));
    this.#aim();
    this.#show();
  }

  /** A letter asks for a verdict on the selection, or on the row at hand when nothing is selected. */
  #ask(verdict) {
    if (!this.selection.count && this.shown.length) this.selection.apply([this.shown[this.active]]);
    this.act(verdict);
  }

  #show() {
    const top = this.active * ROW, view = this.scroller, head = this.thead.offsetHeight;
    if (top < view.scrollTop) view.scrollTop = top;
    else if (top + ROW + head > view.scrollTop + view.clientHeight) view.scrollTop = top + ROW + head - view.clientHeight;
    this.#paint();
    this.tbody.querySelector(".here")?.scrollIntoView({ block: "nearest", inline: "nearest" });
  }

  /** Bring the first selected row into view. */
  reveal() {
    const at = this.shown.findIndex((row) => this.selection.has(row));
    if (at >= 0) { this.active = at; this.scroller.scrollTop = Math.max(0, at * ROW - ROW * 2); this.#paint(); }
  }
}

function space(rows) {
  const line = document.createElement("tr");
  line.className = "space";
  line.setAttribute("aria-hidden", "true");
  line.style.height = `${Math.max(0, rows) * ROW}px`;
  return line;
}

function sign({ sign: text, label, shape }) {
  const mark = document.createElement("span");
  mark.className = `sign sign-${shape}`;
  mark.setAttribute("role", "img");
  mark.setAttribute("aria-label", label);
  mark.textContent = text;
  return mark;
}

function depthText(model, row) {
  const { top, base } = model.rows;
  if (top[row] === null) return "–";
  return base[row] === null || base[row] === top[row] ? top[row].toFixed(1) : `${top[row].toFixed(1)}–${base[row].toFixed(1)}`;
}
