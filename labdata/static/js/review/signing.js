// What would be signed, or was: counts, who decided, rejections and holds with their reasons; sign and re-open.

import { make, plural, when } from "./dom.js";

const LISTED = 200;

export class SignPanel {
  constructor(box, model, { reasons, selection, table, bar, records }) {
    Object.assign(this, { box, reasons, selection, table, bar, records });
    this.update(model);
  }

  update(model) {
    const { counts, people, signature, history } = model.data;
    this.model = model;
    this.box.replaceChildren(...[
      signature ? this.#signed(signature) : null,
      this.#papers(model.data.records),
      make("dl", { class: "facts" }, ...["results", "accepted", "rejected", "held", "undecided"].flatMap((name) => [make("dt", {}, name), make("dd", {}, counts[name].toLocaleString("en-GB"))])),
      make("p", {}, Object.keys(people).length ? `Decided by ${Object.entries(people).map(([name, n]) => `${name} (${n})`).join(", ")}.` : "Nobody has decided anything yet."),
      ...this.#lists(model.data.decisions),
      make("h2", {}, "What happened"), this.#history(history),
    ].filter(Boolean));
  }

  #signed({ by, at, meaning, seal, holds }) {
    return make("div", { class: `notice ${holds ? "success" : "error"}` },
      make("p", {}, make("strong", {}, `Signed by ${by}, ${when(at)}.`), ` ${meaning}`),
      make("p", { class: "small" }, holds ? "The seal holds: the set says what was signed. " : "The seal is broken: the set no longer says what was signed. ", make("code", {}, seal.slice(0, 16))));
  }

  /** A link to the signed record of each signature the set ever had. */
  #papers(records) {
    return records.length ? make("ul", { class: "papers" }, ...records.map(({ id, by, at, ended }) => make("li", {},
      make("a", { href: `${this.records}${id}.pdf`, download: true }, "Signed record (PDF)"), ` ${by}, ${when(at)}${ended ? ", ended by a re-opening" : ""}`))) : null;
  }

  #lists(decisions) {
    return ["rejected", "held"].flatMap((verdict) => {
      const some = decisions.filter((one) => one.verdict === verdict);
      return some.length ? [make("h2", {}, `${plural(some.length, "result")} ${verdict}`), make("ul", { class: "decided" }, ...this.#byReason(some))] : [];
    });
  }

  #byReason(decisions) {
    const groups = new Map();
    for (const one of decisions.slice(0, LISTED * 20)) {
      const why = [this.reasons[one.reason] ?? one.reason, one.text].filter(Boolean).join(": ");
      const key = `${why} — ${one.by}, ${when(one.at)}`;
      groups.set(key, [...(groups.get(key) ?? []), one]);
    }
    return [...groups].slice(0, LISTED).map(([why, some]) => make("li", {}, make("button", { type: "button", class: "quiet", onclick: () => this.#show(some) }, names(this.model, some)), ` ${why}`));
  }

  #show(some) {
    this.selection.apply(some.map((one) => one.row));
    this.bar?.choose([...new Set(some.map((one) => one.key))]);
    this.table.reveal();
  }

  #history(entries) {
    return make("ul", { class: "history" }, ...entries.map((entry) => make("li", {}, make("time", { datetime: entry.at }, when(entry.at)), `${entry.by} ${entry.what}`, entry.reason ? make("span", { class: "muted" }, ` (${entry.reason})`) : null)));
  }
}

function names(model, some) {
  const first = some.slice(0, 3).map((one) => `${model.byKey.get(one.key)?.label ?? one.key} of ${model.name(one.row)}`).join(", ");
  return some.length > 3 ? `${first} and ${some.length - 3} more` : first;
}
