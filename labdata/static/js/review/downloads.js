// «Download this plot»: which plots there are, and the address of the one chosen.

import { make } from "./dom.js";

/** `shown()`: keys of the tracks now drawn. */
export class Downloads {
  constructor(form, model, shown) {
    const { columns, figures } = model, both = (x, y) => model.column(x) && model.column(y);
    const known = figures.crossplots.filter(({ x, y }) => both(x, y));
    form.elements.what.replaceChildren(
      make("option", { value: "shown" }, "The tracks shown"),
      make("optgroup", { label: "One track" }, ...columns.map((column, n) => make("option", { value: `track ${n}` }, column.label))),
      make("optgroup", { label: "Cross-plots" }, ...known.map((plot, n) => make("option", { value: `known ${n}` }, plot.title)), make("option", { value: "own" }, "The pair of the sixth plot")));
    form.addEventListener("formdata", ({ formData }) => {
      const [kind, n] = formData.get("what").split(" "), add = (name, value) => formData.append(name, value);
      formData.delete("what");
      if (kind === "shown") { add("plot", "tracks"); for (const key of shown()) add("column", key); }
      else if (kind === "track") { add("plot", "tracks"); add("column", columns[n].key); }
      else { add("plot", "pair"); for (const axis of ["x", "y"]) add(axis, kind === "own" ? document.querySelector(`select[name=pair_${axis}]`).value : known[n][axis]); }
    });
  }
}
