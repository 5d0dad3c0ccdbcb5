// Checks of the plot modules; the outcome is read by the test that serves this page.

import { Grid, Points } from "/static/js/plots/grid.js";
import { caught, inside, rectangle } from "/static/js/plots/lasso.js";
import { ARROWS, Marks, lookOf } from "/static/js/plots/marks.js";
import { Scale, domainOf, extent, held, roundStep, tickText } from "/static/js/plots/scale.js";
import { Selection } from "/static/js/plots/selection.js";
import { ResultTable } from "/static/js/plots/table.js";
import { Model } from "/static/js/review/model.js";

const checks = [];
const check = (name, run) => checks.push([name, run]);
const frame = () => new Promise((done) => requestAnimationFrame(() => requestAnimationFrame(done)));

function same(found, wanted) {
  const [a, b] = [JSON.stringify(found), JSON.stringify(wanted)];
  if (a !== b) throw new Error(`found ${a}, wanted ${b}`);
}
const near = (found, wanted) => { if (Math.abs(found - wanted) > 1e-9) throw new Error(`found ${found}, wanted ${wanted}`); };

check("a linear scale goes there and back", () => {
  const scale = new Scale([400, 500], [10, 210]);
  near(scale.to(450), 110);
  near(scale.from(110), 450);
});
check("depth runs down the screen", () => same([2000, 2100].map((md) => new Scale([2000, 2100], [0, 500]).to(md)), [0, 500]));
check("an inverted scale turns the axis round", () => near(new Scale([0, 10], [100, 0]).to(10), 0));
check("a logarithmic scale gives each decade the same room", () => {
  const scale = new Scale([0.01, 100], [0, 400], true);
  near(scale.to(0.1), 100);
  near(scale.from(300), 10);
  same(scale.ticks(9), [0.01, 0.1, 1, 10, 100]);
});
check("ticks are round numbers inside the domain", () => same(new Scale([413, 462], [0, 1]).ticks(5), [420, 430, 440, 450, 460]));
check("ticks carry no trailing noise", () => same(new Scale([0, 0.5], [0, 1]).ticks(5).map(tickText), ["0", "0.1", "0.2", "0.3", "0.4", "0.5"]));
check("a step is 1, 2 or 5 times a power of ten", () => same([0.03, 0.3, 3, 7, 20].map(roundStep), [0.05, 0.5, 5, 10, 20]));
check("missing values have no part in an extent", () => same(extent([NaN, 3, -1, NaN, 2]), [-1, 3]));
check("an extent above nought for a logarithmic axis", () => same(extent([0, 0.02, 5], 0), [0.02, 5]));
check("a domain starts at nought where asked and no value is below", () => same(domainOf(2, 10, { zero: true })[0], 0));
check("a domain of one value has room", () => { const [low, high] = domainOf(5, 5); if (!(low < 5 && high > 5)) throw new Error(`${low} ${high}`); });
check("a domain of nothing is drawn all the same", () => same(domainOf(Infinity, -Infinity), [0, 1]));

check("a value beyond its axis stands at the edge and says which way it lies", () => same([held([0, 10], -2), held([0, 10], 4), held([0, 10], 99)], [[-1, 0], [0, 4], [1, 10]]));

check("inside a path by even-odd", () => {
  const square = rectangle(0, 0, 10, 10);
  same([inside(square, 5, 5), inside(square, 15, 5), inside(square, 5, -1)], [true, false, false]);
});
check("a path that turns in leaves out its bay", () => {
  const bay = [0, 0, 10, 0, 10, 10, 5, 2, 0, 10];
  same([inside(bay, 5, 1), inside(bay, 5, 6), inside(bay, 1, 6)], [true, false, true]);
});
check("a lasso catches each row once", () => {
  const points = new Points(2);
  for (const [x, y, row] of [[1, 1, 7], [2, 2, 7], [3, 3, 8], [50, 50, 9]]) points.push(x, y, row, 0, 0);
  same([...caught(points, rectangle(0, 0, 10, 10))], [7, 8]);
});
check("points grow beyond their first room and keep what they hold", () => {
  const points = new Points(2);
  for (let n = 0; n < 100; n += 1) points.push(n, n, n, 0, 0);
  same([points.count, points.x[99], points.row[1]], [100, 99, 1]);
});
check("the grid finds the nearest within reach, across cells", () => {
  const points = new Points();
  points.push(23, 23, 0, 0, 0); points.push(26, 26, 1, 0, 0); points.push(300, 300, 2, 0, 0);
  const grid = new Grid(points);
  same([grid.nearest(24, 24), grid.nearest(26, 25), grid.nearest(100, 100)], [0, 1, -1]);
});
check("the grid agrees with looking at all", () => {
  const points = new Points();
  let seed = 7;
  const dice = () => { seed = (seed * 16807) % 2147483647; return seed / 2147483647; };
  for (let n = 0; n < 500; n += 1) points.push(dice() * 400, dice() * 400, n, 0, 0);
  const grid = new Grid(points);
  for (let n = 0; n < 200; n += 1) {
    const x = dice() * 400, y = dice() * 400;
    let best = -1, least = 81;
    for (let i = 0; i < points.count; i += 1) { const apart = (points.x[i] - x) ** 2 + (points.y[i] - y) ** 2; if (apart < least) { least = apart; best = i; } }
    same(grid.nearest(x, y), best);
  }
});

check("a selection replaces, adds, takes away and toggles", () => {
  const selection = new Selection(6);
  selection.apply([1, 2]);
  selection.apply([4], "add");
  selection.apply([2], "remove");
  selection.apply([4, 5], "toggle");
  same([[...selection.rows()], selection.count], [[1, 5], 2]);
});
check("listeners are told once a frame, however often it changes", async () => {
  const selection = new Selection(3);
  let told = 0;
  selection.subscribe(() => { told += 1; });
  selection.apply([0]); selection.apply([1]); selection.apply([2]);
  await frame();
  same(told, 1);
});

const MARKERS = { computed: { shape: "square", colour: "#56b4e9", sign: "□", label: "computed" }, accepted: { shape: "disc", colour: "#009e73", sign: "●", label: "accepted" }, undecided: { shape: "ring", colour: "#4f5a5b", sign: "○", label: "undecided" }, flagged: { shape: "triangle", colour: "#a8487d", sign: "▲", label: "flagged" }, held: { shape: "half", colour: "#b87f00", sign: "◐", label: "held" }, rejected: { shape: "cross", colour: "#d55e00", sign: "✕", label: "rejected" } };
const STATES = Object.keys(MARKERS);

function stamped(look, chosen = false) {
  const canvas = Object.assign(document.createElement("canvas"), { width: 40, height: 40 }), pen = canvas.getContext("2d");
  const points = new Points();
  points.push(20, 20, 0, 0, look);
  new Marks(STATES, MARKERS, "#0072b2", 4).stampAll(pen, points, chosen ? [1] : null);
  const { data } = pen.getImageData(0, 0, 40, 40);
  let ink = "";
  for (let at = 0; at < data.length; at += 4) ink += data[at + 3] > 100 && Math.min(data[at], data[at + 1], data[at + 2]) < 200 ? 1 : 0;
  return ink;
}
check("every state has a shape of its own, colour apart", () => same(new Set(STATES.map((_, state) => stamped(lookOf(state)))).size, STATES.length));
check("a limit is an arrow that points where the truth lies", () => same(new Set(Object.values(ARROWS).map((arrow) => stamped(lookOf(1, arrow)))).size, 5));
check("a selected mark differs by more than colour", () => { if (stamped(lookOf(1)) === stamped(lookOf(1), true)) throw new Error("no ring"); });

const column = (key, value, more = {}) => ({ key, analyte: key, method: "pyrolysis", unit: "wt%", label: key, log: false, zero: true, decimals: 2, computed: false, result: value.map((v, n) => (v === null ? null : 100 + n)), value, qualifier: {}, verdict: value.map(() => 0), flag: value.map(() => 0), ...more });
const DATA = {
  figures: { states: STATES, markers: MARKERS }, verdicts: ["undecided", "accepted", "rejected", "held"], severities: ["", "info", "warn", "reject-candidate"], bands: {},
  rows: { label: ["A-10", "A-9", "A-11"], sample: [1, 2, 3], replicate: [1, 1, 2], kind: ["core", "core", "core"], top: [10, 20, null], base: [12, null, null], formation: ["", "", ""] },
  columns: [column("TOC", [1.5, 0.05, 3], { qualifier: { 1: "<" }, verdict: [1, 0, 2], flag: [0, 2, 3] }), column("TMAX", [430, null, 440], { decimals: 0 })],
};
check("a value keeps its qualifier and decimals", () => { const model = new Model(DATA); same([model.shown(model.columns[0], 0), model.shown(model.columns[0], 1), model.shown(model.columns[1], 1)], ["1.50", "<0.05", ""]); });
check("a verdict outranks a flag, a flag of weight an open value", () => { const model = new Model(DATA); same([0, 1, 2].map((row) => model.stateName(model.columns[0], row)), ["accepted", "flagged", "rejected"]); });
check("a rejected value does not stretch its axis", () => {
  const model = new Model({ ...DATA, columns: [column("HI", [200, 400, 5000], { verdict: [1, 1, 2] })] });
  const [, high] = model.columns[0].domain;
  same([high < 500, model.columns[0].above, model.columns[0].below], [true, true, false]);
});
check("results of rows and columns leave out what was not measured", () => same(new Model(DATA).results([0, 1], ["TOC", "TMAX"]), [100, 101, 100]));

function table(selection) {
  const box = document.createElement("div");
  box.style.height = "200px";
  document.body.append(box);
  const asked = [];
  const made = new ResultTable(box, new Model(DATA), selection, { act: (verdict) => asked.push(verdict), aim: () => {}, count: () => {} });
  return { made, box, asked };
}
const press = (made, key, more = {}) => made.table.dispatchEvent(new KeyboardEvent("keydown", { key, bubbles: true, cancelable: true, ...more }));
check("blanks sort last whichever way", () => {
  const { made, box } = table(new Selection(3));
  same(made.shown, [0, 1, 2]);
  box.querySelector("button[data-key=depth]").click();
  same(made.shown, [1, 0, 2]);
  box.remove();
});
check("labels sort as people count", () => { const { made, box } = table(new Selection(3)); box.querySelector("button[data-key=sample]").click(); same(made.shown, [1, 0, 2]); box.remove(); });
check("a numeric range narrows the rows", () => { const { made, box } = table(new Selection(3)); made.filters = [{ key: "TOC", low: 1, high: Infinity }]; made.arrange(); same(made.shown, [0, 2]); box.remove(); });
check("keys move, select, extend and ask for a verdict", () => {
  const selection = new Selection(3), { made, box, asked } = table(selection);
  press(made, "ArrowDown"); press(made, " ");
  same([...selection.rows()], [1]);
  press(made, "ArrowDown", { shiftKey: true });
  same([...selection.rows()], [1, 2]);
  press(made, "r");
  same(asked, ["rejected"]);
  press(made, "Escape");
  same(selection.count, 0);
  box.remove();
});
check("the table tells a reader how many rows there are and which is at hand", () => {
  const { made, box } = table(new Selection(3));
  same([made.table.getAttribute("aria-rowcount"), made.table.getAttribute("aria-activedescendant")], ["4", "cell-0-0"]);
  box.remove();
});

const outcome = [];
for (const [name, run] of checks) {
  try { await run(); outcome.push({ name, fault: null }); } catch (error) { outcome.push({ name, fault: String(error) }); }
}
document.querySelector("#outcome").textContent = JSON.stringify(outcome);
document.querySelector("#outcome").dataset.done = "yes";
