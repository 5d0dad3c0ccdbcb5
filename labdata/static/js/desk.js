// The mapping desk by keyboard and pointer: moving through the cells, from a header to its mapping and back.
// Everything also works without this file: cells and mapping rows are linked, forms are sent by their buttons.

const STEPS = { ArrowUp: [-1, 0], ArrowDown: [1, 0], ArrowLeft: [0, -1], ArrowRight: [0, 1] };
const BOXES = ["grid-box", "mapping-box"];
const places = new Map();

/** The cell a step away from this one; lines without cells of the sheet are passed over. */
function neighbour(cell, [down, across]) {
  if (across) {
    const beside = across > 0 ? cell.nextElementSibling : cell.previousElementSibling;
    return beside?.matches("td") ? beside : null;
  }
  let row = cell.parentElement;
  do row = down > 0 ? row.nextElementSibling : row.previousElementSibling;
  while (row && !row.querySelector("td[id]"));
  return row?.children[cell.cellIndex] ?? null;
}

/** Focuses a cell; it alone is then in the order of the tab key. */
function enter(cell) {
  for (const other of document.querySelectorAll("[data-grid] td[tabindex='0']")) other.tabIndex = -1;
  cell.tabIndex = 0;
  cell.focus();
}

/** Goes to the list in which a header's field is chosen. */
function openMapping(cell) {
  const row = document.getElementById(cell.dataset.mapping ?? "");
  row?.querySelector("select")?.focus();
  row?.scrollIntoView({ block: "nearest" });
}

function onKey(event) {
  const cell = event.target.closest("[data-grid] td[id]");
  const box = event.target.id === "grid-box";
  const step = STEPS[event.key];
  if (!cell && box && step) {
    const first = document.querySelector("[data-grid] td[id].in-head") ?? document.querySelector("[data-grid] td[id]");
    if (first) { event.preventDefault(); enter(first); }
  } else if (cell && step) {
    const next = neighbour(cell, step);
    event.preventDefault();
    if (next) enter(next);
  } else if (cell && event.key === "Enter" && cell.dataset.mapping) {
    event.preventDefault();
    openMapping(cell);
  } else if (cell && event.key === "Escape") {
    document.getElementById("grid-box").focus();
  }
}

function onClick(event) {
  const cell = event.target.closest("[data-grid] td[id]");
  if (!cell) return;
  enter(cell);
  if (cell.dataset.mapping) openMapping(cell);
}

/** Marks the header of the column whose field is being chosen. */
function onFocus(event) {
  for (const shown of document.querySelectorAll(".is-shown")) shown.classList.remove("is-shown");
  const row = event.target.closest("tr[data-cell]");
  if (row) document.getElementById(row.dataset.cell)?.classList.add("is-shown");
}

/** Keeps the boxes where they were scrolled to when the desk comes anew. */
function keepPlaces() {
  for (const id of BOXES) {
    const box = document.getElementById(id);
    if (box) places.set(id, [box.scrollTop, box.scrollLeft]);
  }
}

function restorePlaces() {
  for (const [id, [top, left]] of places) document.getElementById(id)?.scrollTo(left, top);
}

document.addEventListener("keydown", onKey);
document.addEventListener("click", onClick);
document.addEventListener("focusin", onFocus);
document.addEventListener("htmx:beforeSwap", keepPlaces);
document.addEventListener("htmx:afterSwap", restorePlaces);
