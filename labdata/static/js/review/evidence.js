// Evidence of a flag as it was recorded: numbers with their limits, cells with their addresses, neighbours.

import { make } from "./dom.js";

const words = (name) => String(name).replaceAll("_", " ");

function number(value) {
  return Number.isInteger(value) ? String(value) : String(Number(value.toPrecision(5)));
}

function isPlain(value) { return value === null || typeof value !== "object"; }

function said(value) {
  if (value === null || value === undefined || value === "") return "–";
  if (typeof value === "number") return number(value);
  if (typeof value === "boolean") return value ? "yes" : "no";
  return String(value);
}

/** Records of the same shape as a small table. */
function records(list) {
  const names = [...new Set(list.flatMap((one) => Object.keys(one)))].filter((name) => list.some((one) => one[name] !== null && one[name] !== undefined));
  return make("div", { class: "table-box", tabindex: "0", role: "group", "aria-label": "evidence records" }, make("table", { class: "evidence-table" },
    make("thead", {}, make("tr", {}, ...names.map((name) => make("th", { scope: "col" }, words(name))))),
    make("tbody", {}, ...list.map((one) => make("tr", {}, ...names.map((name) => make("td", {}, isPlain(one[name]) ? said(one[name]) : shown(one[name]))))))));
}

function shown(value) {
  if (isPlain(value)) return said(value);
  if (Array.isArray(value)) {
    if (!value.length) return "none";
    if (value.every(isPlain)) return value.length > 24 ? `${value.slice(0, 24).map(said).join(", ")}, … (${value.length})` : value.map(said).join(", ");
    return value.every((one) => one && !Array.isArray(one)) ? records(value) : make("ul", {}, ...value.map((one) => make("li", {}, shown(one))));
  }
  return evidence(value);
}

/** A record as a list of names and values. */
export function evidence(record) {
  const entries = Object.entries(record ?? {}).filter(([, value]) => value !== null && value !== "");
  if (!entries.length) return make("p", { class: "small muted" }, "Nothing more was recorded.");
  return make("dl", { class: "evidence" }, ...entries.flatMap(([name, value]) => [make("dt", {}, words(name)), make("dd", {}, shown(value))]));
}
