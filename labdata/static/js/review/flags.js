// Flags grouped by rule: what was found, on which evidence, by which source; agree or dismiss, singly or all alike.

import { make, plural } from "./dom.js";
import { evidence } from "./evidence.js";
import { thread } from "./notes.js";
import { load } from "./server.js";

const WEIGHT = { "reject-candidate": 0, warn: 1, info: 2 };
const SHOWN = 60;

export class FlagPanel {
  constructor(box, model, { selection, bar, send, address, mayDecide, table, notes }) {
    Object.assign(this, { box, model, selection, bar, send, address, mayDecide, table, notes, open: new Set(), talking: new Set() });
    this.update(model);
  }

  update(model) {
    this.model = model;
    const groups = new Map();
    for (const flag of model.data.flags) groups.set(flag.rule, [...(groups.get(flag.rule) ?? []), flag]);
    const rank = (flags) => [weighty(flags).length ? 0 : 1, Math.min(...flags.map((flag) => WEIGHT[flag.severity])), -flags.length];
    const ordered = [...groups].sort(([, a], [, b]) => compare(rank(a), rank(b)));
    const asked = model.data.notes.filter((note) => note.open).length;
    this.box.replaceChildren(...(asked ? [make("p", {}, make("a", { href: `${this.notes}questions.txt`, download: true }, `${plural(asked, "open question")} to the laboratory, as a text`))] : []), ...(ordered.length ? ordered.map(([rule, flags]) => this.#group(rule, flags)) : [none()]));
  }

  #group(rule, flags) {
    const worst = flags.reduce((a, b) => (WEIGHT[a.severity] <= WEIGHT[b.severity] ? a : b)).severity;
    const group = make("details", { class: "rule", "data-rule": rule },
      make("summary", {}, make("span", { class: `state state-${worst}` }, this.#title(rule)), make("span", { class: "count" }, counted(flags))));
    group.open = this.open.has(rule);
    group.addEventListener("toggle", () => { if (group.open) { this.open.add(rule); this.#fill(group, flags); } else this.open.delete(rule); });
    if (group.open) this.#fill(group, flags);
    return group;
  }

  #title(rule) { return this.model.data.rules[rule]?.[0] ?? rule.replaceAll("_", " "); }

  #fill(group, flags) {
    if (group.dataset.filled) return;
    group.dataset.filled = "yes";
    const left = flags.filter((flag) => !flag.answer), tests = this.model.data.rules[flags[0].rule]?.[1];
    if (tests) group.append(make("p", { class: "tests" }, `${tests} `, make("code", {}, flags[0].rule)));
    group.append(this.#tools(flags, `all ${flags.length}`, left), make("ul", { class: "flags" }, ...flags.slice(0, SHOWN).map((flag) => this.#flag(flag))));
    if (flags.length > SHOWN) group.append(make("p", { class: "small muted" }, `${flags.length - SHOWN} more are in the table: select all of this rule to see them.`));
    group.append(make("p", { class: "small muted" }, `Source: ${flags[0].source}`));
  }

  /** Select, agree and dismiss for one flag or for all of a rule. */
  #tools(flags, which, open = flags.filter((flag) => !flag.answer)) {
    const tools = make("div", { class: "flag-tools" }, make("button", { type: "button", class: "small", onclick: () => this.#select(flags) }, `Select ${which}`));
    if (this.mayDecide() && open.length) {
      tools.append(
        make("button", { type: "button", class: "small", onclick: () => this.#ask(tools, open, "agreed") }, "Agree…"),
        make("button", { type: "button", class: "small", onclick: () => this.#ask(tools, open, "dismissed") }, "Dismiss…"));
    }
    return tools;
  }

  #select(flags) {
    const rows = flags.flatMap((flag) => this.model.flagged(flag));
    const keys = [...new Set(flags.map((flag) => flag.key))].filter((key) => this.model.byKey.get(key) && !this.model.byKey.get(key).computed);
    this.selection.apply(rows);
    this.bar?.choose(keys.length ? keys : null);
    this.table.reveal();
  }

  #ask(tools, flags, answer) {
    tools.parentElement.querySelector(":scope > form")?.remove();
    const results = [...new Set(flags.map((flag) => flag.result).filter(Boolean))];
    const form = make("form", { class: "answer" }, ...this.#fields(answer, results.length),
      make("button", { type: "submit", class: "primary" }, answer === "agreed" ? `Agree with ${plural(flags.length, "flag")}` : `Dismiss ${plural(flags.length, "flag")}`),
      make("button", { type: "button", onclick: () => form.remove() }, "Cancel"));
    form.addEventListener("submit", async (event) => {
      event.preventDefault();
      const fields = form.elements, reject = fields.reject?.checked;
      await this.send("answer", {
        answer, flags: flags.map((flag) => [flag.rule, flag.mark]), answer_reason: fields.words.value,
        ...(reject ? { results, verdict: "rejected", reason: fields.code.value } : {}),
      });
    });
    tools.after(form);
    form.elements.words.focus();
  }

  #fields(answer, results) {
    const words = make("label", {}, answer === "agreed" ? "What you see in it" : "Why it does not hold here", make("input", { name: "words", required: true, maxlength: 500 }));
    if (answer !== "agreed" || !results) return [words];
    const code = document.querySelector("#decision select[name=reason]").cloneNode(true);
    code.name = "code"; code.removeAttribute("id"); code.required = true; code.removeAttribute("aria-label");
    code.querySelector("option[value=other]").value = "other";
    return [words, make("label", { class: "tick" }, make("input", { type: "checkbox", name: "reject", checked: true }), `reject the ${plural(results, "flagged result")} as`), make("label", { class: "unseen-label" }, make("span", { class: "unseen" }, "Reason code"), code)];
  }

  #flag(flag) {
    const where = flag.row === null || flag.row === undefined ? span(flag.interval) : this.model.name(flag.row), rows = this.model.flagged(flag);
    const item = make("li", {}, make("p", {}, make("strong", {}, where), ` ${flag.message}`),
      flag.answer ? make("p", { class: "small muted" }, `${flag.answer.answer === "agreed" ? "Agreed" : "Dismissed"} by ${flag.answer.by}: ${flag.answer.reason}`) : null);
    const tools = this.#tools([flag], rows.length === 1 ? "it" : plural(rows.length, "sample"));
    if (!rows.length) tools.firstChild.remove();
    const more = make("details", { class: "more" }, make("summary", {}, "Evidence"));
    more.addEventListener("toggle", () => this.#evidence(more, flag), { once: true });
    item.append(tools, more, thread(flag, this));
    return item;
  }

  async #evidence(more, flag) {
    try {
      const told = await load(this.address(flag.id));
      more.append(evidence(told.evidence), make("p", { class: "small muted" }, `Source: ${told.source}`));
    } catch (refusal) { more.append(make("p", { class: "state state-error" }, refusal.message)); }
  }
}

/** Flags of weight that nobody has answered yet. */
function weighty(flags) { return flags.filter((flag) => !flag.answer && flag.severity !== "info"); }

function counted(flags) {
  const open = weighty(flags).length, all = flags.length;
  if (open) return open < all ? `${open} of ${all} open` : `${open} open`;
  return flags.every((flag) => flag.answer) ? `${all} answered` : `${all} for information`;
}

function span(interval) { return interval ? `${interval[0]}–${interval[1]} m` : "whole well"; }

function compare(a, b) {
  for (let at = 0; at < a.length; at += 1) if (a[at] !== b[at]) return a[at] - b[at];
  return 0;
}

function none() {
  return make("p", { class: "empty" }, "No rule found anything here. Flags appear when QC has run on the well.");
}
