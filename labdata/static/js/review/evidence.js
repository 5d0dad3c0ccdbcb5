// Evidence of a flag as it was recorded: computed against the limit, cells with their addresses, neighbours, causes.

import { make } from "./dom.js";

const FIRST = ["computed", "limit", "interval_m", "alternatives", "discriminating_test"];
const LEFT_OUT = new Set(["rule", "version", "inputs", "neighbours", "parameters", "depth", ...FIRST]);
const INPUT = ["sample", "analyte", "text", "unit", "cell", "sheet", "file"];
const DRAWN = new Set(["x", "y", "points_shown"]); // of a fit: drawn in the cross-plot

const words = (name) => String(name).replaceAll("_", " ");

const isPlain = (value) => value === null || typeof value !== "object";

function said(value) {
  if (value === null || value === undefined || value === "") return "–";
  if (typeof value === "number") return Number.isInteger(value) ? String(value) : String(Number(value.toPrecision(5)));
  return typeof value === "boolean" ? (value ? "yes" : "no") : String(value);
}

/** Records of the same shape as a small table. */
function records(list, names = [...new Set(list.flatMap((one) => Object.keys(one)))]) {
  const used = names.filter((name) => list.some((one) => one[name] !== null && one[name] !== undefined && one[name] !== ""));
  return make("div", { class: "table-box", tabindex: "0", role: "group", "aria-label": "records" }, make("table", { class: "evidence-table" },
    make("thead", {}, make("tr", {}, ...used.map((name) => make("th", { scope: "col" }, words(name))))),
    make("tbody", {}, ...list.map((one) => make("tr", {}, ...used.map((name) => make("td", {}, isPlain(one[name]) ? said(one[name]) : shown(one[name]))))))));
}

function shown(value) {
  if (isPlain(value)) return said(value);
  if (!Array.isArray(value)) return list(Object.entries(value).filter(([name]) => !DRAWN.has(name)));
  if (!value.length) return "none";
  if (value.every(isPlain)) return value.some((one) => typeof one === "string" && one.length > 24)
    ? make("ul", {}, ...value.map((one) => make("li", {}, said(one)))) : value.map(said).join(", ");
  return value.every((one) => one && !Array.isArray(one)) ? records(value) : make("ul", {}, ...value.map((one) => make("li", {}, shown(one))));
}

function list(entries) {
  return make("dl", { class: "evidence" }, ...entries.flatMap(([name, value]) => [make("dt", {}, words(name)), make("dd", {}, shown(value))]));
}

function limits(parameters) {
  return make("details", { class: "more" }, make("summary", {}, "Limits used and where they come from"),
    make("ul", {}, ...Object.entries(parameters).map(([name, { value, unit, source, from }]) => make("li", {}, `${words(name)} ${said(value)} ${unit ?? ""} (${[from, source].filter(Boolean).join("; ")})`))));
}

/** A whole evidence record. */
export function evidence(record) {
  const known = Object.entries(record ?? {}).filter(([, value]) => value !== null && value !== "");
  if (!known.length) return make("p", { class: "small muted" }, "Nothing more was recorded.");
  const first = FIRST.filter((name) => record[name] !== null && record[name] !== undefined && record[name] !== "").map((name) => [name, record[name]]);
  const rest = known.filter(([name]) => !LEFT_OUT.has(name));
  const box = make("div", { class: "evidence-box" }, list(first));
  if (record.inputs?.length) box.append(make("h2", {}, "As the laboratory reported it"), records(record.inputs, INPUT));
  if (record.neighbours?.length) box.append(make("h2", {}, "Neighbours in depth"), records(record.neighbours));
  if (rest.length) box.append(list(rest));
  if (record.parameters) box.append(limits(record.parameters));
  return box;
}
