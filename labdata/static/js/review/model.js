// What the server sent, as typed arrays the plots can walk: one row a sample and replicate, one column an analyte.

import { domainOf, extent } from "../plots/scale.js";

const ARROW = { "<": 1, ">": 2 };

export class Model {
  constructor(data) {
    Object.assign(this, { data, figures: data.figures, rows: data.rows, bands: data.bands });
    this.count = data.rows.label.length;
    this.top = numbers(data.rows.top);
    this.base = numbers(data.rows.base.map((base, row) => base ?? data.rows.top[row]));
    this.middle = this.top.map((top, row) => (top + this.base[row]) / 2);
    this.columns = data.columns.map((column) => this.#column(column));
    this.byKey = new Map(this.columns.map((column) => [column.key, column]));
  }

  #column(sent) {
    const value = numbers(sent.value), arrow = new Uint8Array(this.count), state = new Uint8Array(this.count);
    for (const [row, sign] of Object.entries(sent.qualifier)) arrow[row] = ARROW[sign] ?? 0;
    const rank = Object.fromEntries(this.figures.states.map((name, at) => [name, at]));
    const undecided = this.data.verdicts.indexOf("undecided"), weighty = this.data.severities.indexOf("warn");
    for (let row = 0; row < this.count; row += 1) {
      const verdict = sent.verdict[row];
      state[row] = sent.computed ? rank.computed
        : verdict === undecided && sent.flag[row] >= weighty ? rank.flagged : rank[this.data.verdicts[verdict]];
    }
    const kept = value.filter((_, row) => state[row] !== rank.rejected), floor = sent.log ? 0 : undefined;
    let [low, high] = extent(kept, floor); // an axis fits what is kept; a rejected value beyond it stands at the edge
    if (low > high) [low, high] = extent(value, floor);
    const domain = domainOf(low, high, sent);
    return { ...sent, value, arrow, state, domain, below: arrow.includes(ARROW["<"]) || value.some((one) => one < domain[0]), above: arrow.includes(ARROW[">"]) || value.some((one) => one > domain[1]) };
  }

  /** The column of an analyte: the first where two methods gave it. */
  column(analyte) { return this.byKey.get(analyte) ?? this.columns.find((column) => column.analyte === analyte); }

  has(column, row) { return column.value[row] === column.value[row] || String(row) in column.qualifier; }

  /** A value as it is written: qualifier and decimals of the report; empty where not measured. */
  shown(column, row) {
    if (!this.has(column, row)) return "";
    const value = column.value[row];
    return `${column.qualifier[row] ?? ""}${value === value ? value.toFixed(column.decimals) : "?"}`;
  }

  stateName(column, row) { return this.has(column, row) ? this.figures.states[column.state[row]] : ""; }

  hasState(row, state) { return this.columns.some((column) => !column.computed && this.stateName(column, row) === state); }

  name(row) {
    const { label, replicate } = this.rows;
    return `${label[row] || "no label"}${replicate[row] > 1 ? ` (run ${replicate[row]})` : ""}`;
  }

  /** Result ids of the rows in the columns named. */
  results(rows, keys) {
    const found = [];
    for (const key of keys) {
      const { result } = this.byKey.get(key);
      for (const row of rows) if (result[row] !== null) found.push(result[row]);
    }
    return found;
  }

  /** Rows that a flag speaks of: its own, or those of its interval. */
  flagged({ row, interval }) {
    if (row !== null && row !== undefined) return [row];
    if (!interval) return [];
    const found = [];
    for (let at = 0; at < this.count; at += 1) if (this.middle[at] >= interval[0] && this.middle[at] <= interval[1]) found.push(at);
    return found;
  }

  measured() { return this.columns.filter((column) => !column.computed); }
}

function numbers(list) {
  return Float64Array.from(list, (value) => value ?? NaN);
}
