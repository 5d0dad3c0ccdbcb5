// The review page: loads the data, lays out plots, table and panels, and carries every change to the server.

import { CrossPlot } from "../plots/crossplot.js";
import { Marks } from "../plots/marks.js";
import { Selection } from "../plots/selection.js";
import { Surface } from "../plots/surface.js";
import { ResultTable } from "../plots/table.js";
import { TrackStrip } from "../plots/track.js";
import { DecisionBar } from "./deciding.js";
import { Downloads } from "./downloads.js";
import { make, oneOf, plural } from "./dom.js";
import { Filters } from "./filters.js";
import { FlagPanel } from "./flags.js";
import { Model } from "./model.js";
import { Note } from "./note.js";
import { load, post } from "./server.js";
import { SignPanel } from "./signing.js";
import { tabs } from "./tabs.js";

const MANY = 2000; // samples from which markers are drawn smaller
const POLL = 20_000;

const root = document.querySelector("[data-review]");
const part = (name) => root.querySelector(`[data-part="${name}"]`);
const config = root.dataset;
const tools = { current: "pick" };
const say = (text, kind = "note") => {
  part("said").className = text ? `said said-${kind}` : "said";
  part("said").textContent = text;
};

class Page {
  constructor(data) {
    this.model = new Model(data);
    this.selection = new Selection(this.model.count);
    const { states, markers, selected } = data.figures;
    this.marks = new Marks(states, markers, selected, this.model.count > MANY ? 2.4 : 3.6, window.devicePixelRatio || 1);
    this.note = new Note(part("note"), () => this.model);
    this.#panels();
    this.#plots();
    this.#controls();
    this.#state();
  }

  #plots() {
    const tell = (hit) => this.note.show(hit);
    this.strip = new TrackStrip(new Surface(part("tracks"), tools), this.model, this.selection, this.marks, tell);
    this.#chooseTracks();
    this.crossplots = [...root.querySelectorAll("[data-crossplot]")].map((box) => new CrossPlot(new Surface(box, tools), this.model, this.selection, this.marks, tell));
    this.#ownPair();
    this.#showCrossPlots();
    this.downloads = new Downloads(root.querySelector("#drawing"), this.model, () => this.tracks);
  }

  /** Which tracks are drawn: the first ten, or those ticked. */
  #chooseTracks() {
    const { model } = this, box = part("track-list");
    this.tracks = new Set(model.columns.slice(0, model.figures.tracks_at_first).map((column) => column.key));
    const show = () => this.strip.show(this.model.columns.filter((column) => this.tracks.has(column.key)));
    box.replaceChildren(...model.columns.map((column) => make("label", {}, make("input", {
      type: "checkbox", checked: this.tracks.has(column.key),
      onchange: (event) => { if (event.target.checked) this.tracks.add(column.key); else this.tracks.delete(column.key); show(); },
    }), column.label)));
    this.showTracks = show;
    show();
  }

  #ownPair() {
    this.pair = ["x", "y"].map((axis) => root.querySelector(`select[name=pair_${axis}]`));
    const usual = [this.model.column("S3") ? "S3" : this.model.columns[0]?.key, this.model.column("RO") ? "RO" : this.model.columns.at(-1)?.key];
    this.pair.forEach((select, n) => {
      select.replaceChildren(...this.model.columns.map((column) => make("option", { value: column.key, selected: column.key === usual[n] }, column.label)));
      select.addEventListener("change", () => this.#showPair());
    });
  }

  #showPair() {
    const [x, y] = this.pair.map((select) => this.model.byKey.get(select.value));
    if (x && y) this.crossplots.at(-1).show(x, y, { invert_x: false, invert_y: false });
  }

  #showCrossPlots() {
    this.model.figures.crossplots.forEach((plot, n) => {
      const x = this.model.column(plot.x), y = this.model.column(plot.y), box = this.crossplots[n].surface.box;
      box.classList.toggle("nothing", !x || !y);
      if (x && y) this.crossplots[n].show(x, y, { ...plot, fits: plot.fit ? this.model.data.fits : [] });
      else box.dataset.missing = `${plot.title}: not measured`;
    });
    this.#showPair();
  }

  #panels() {
    const reasons = Object.fromEntries([...root.querySelectorAll("#decision select[name=reason] option")].map((option) => [option.value, option.textContent]));
    const form = root.querySelector("#decision");
    this.bar = form ? new DecisionBar(form, this.model, this.selection, (name, body) => this.send(name, body)) : null;
    this.table = new ResultTable(part("table"), this.model, this.selection, {
      act: (verdict) => this.bar && !this.bar.form.hidden ? this.bar.ask(verdict) : say("Your role, or the signature, does not let you decide here.", "error"),
      aim: (column) => this.bar?.choose(column && !column.computed ? [column.key] : null),
      count: (shown, all) => { part("shown").textContent = shown === all ? plural(all, "sample") : `${shown} of ${plural(all, "sample")}`; },
    });
    this.filters = new Filters(root.querySelector("#filters"), this.model, this.table, this.selection);
    this.flags = new FlagPanel(part("flags"), this.model, {
      selection: this.selection, bar: this.bar, table: this.table, send: (name, body) => this.send(name, body),
      address: (id) => `${config.flags}${id}/`, notes: config.notes, mayDecide: () => this.mayDecide(),
    });
    this.signing = new SignPanel(part("standing"), this.model, { reasons, selection: this.selection, table: this.table, bar: this.bar, records: config.records });
    tabs(part("side"));
  }

  mayDecide() { return this.model.data.may.includes("decide") && this.model.data.set.state !== "signed"; }

  #controls() {
    oneOf(root.querySelectorAll("[data-tool]"), "pick", (tool) => { tools.current = tool; root.dataset.tool = tool; });
    part("zoom-in").addEventListener("click", () => this.strip.zoom(0.6));
    part("zoom-out").addEventListener("click", () => this.strip.zoom(1 / 0.6));
    part("zoom-all").addEventListener("click", () => { this.strip.reset(); for (const plot of this.crossplots) plot.reset(); });
    part("clear").addEventListener("click", () => this.selection.clear());
    for (const name of ["sign", "reopen"]) {
      const form = root.querySelector(`form[data-post="${name}"]`);
      form?.addEventListener("submit", async (event) => {
        event.preventDefault();
        const body = Object.fromEntries(new FormData(form));
        if (name === "sign") body.meaning = body.words?.trim() || body.meaning;
        if (await this.send(name, body)) form.reset();
        else if (form.elements.password) form.elements.password.value = "";
      });
    }
    setInterval(() => { if (!document.hidden) this.#look(); }, POLL);
  }

  /** What may be done now: the bar, the signature form and the re-opening come and go with state and role. */
  #state() {
    const { may, set, counts, decided_here: own } = this.model.data, signed = set.state === "signed";
    if (this.bar) this.bar.form.hidden = !this.mayDecide();
    const show = (name, on) => { const box = part(name); if (box) box.hidden = !on; };
    const ready = !counts.undecided && !counts.held && counts.results > 0;
    show("sign", may.includes("sign") && !signed && ready && !own);
    show("reopen", may.includes("reopen") && signed);
    part("sign-note").textContent = signNote({ may, signed, counts, own, ready });
    part("counts").replaceChildren(...["accepted", "rejected", "held", "undecided"].map((name) => make("span", { class: `state state-${name}` }, `${counts[name].toLocaleString("en-GB")} ${name}`)));
    part("state").textContent = signed ? "signed" : "in review";
    part("state").className = `state state-${signed ? "signed" : "undecided"}`;
    root.dataset.version = set.version;
  }

  /** Post a change with the version looked at, then show how the set stands. Returns whether it was done. */
  async send(name, body) {
    const from = this.model.data.set.version;
    root.setAttribute("aria-busy", "true");
    try {
      await post(config[name], root.querySelector("[name=csrfmiddlewaretoken]").value, { ...body, version: from });
      await this.reload();
      say(DONE[name] ?? "Done.", "done");
      return true;
    } catch (refusal) {
      if (refusal.code === "conflict") await this.reload().catch(() => null);
      say(refusal.message, "error");
      return false;
    } finally { root.removeAttribute("aria-busy"); }
  }

  async reload() { this.#take(await load(config.data)); }

  /** Has somebody else changed the set? A lost connection says nothing here; the next change will. */
  async #look() {
    const version = this.model.data.set.version;
    const data = await load(`${config.data}?version=${version}`).catch(() => ({ unchanged: true }));
    if (data.unchanged || this.model.data.set.version !== version) return;
    this.#take(data);
    const [last] = data.history;
    if (last) say(`${last.by} ${last.what}.`);
  }

  #take(data) {
    const model = new Model(data);
    if (model.count !== this.model.count) { window.location.reload(); return; }
    this.model = model;
    this.strip.update(model);
    for (const plot of this.crossplots) plot.model = model;
    this.showTracks();
    this.#showCrossPlots();
    this.bar?.update(model);
    this.table.update(model);
    this.flags.update(model);
    this.signing.update(model);
    this.#state();
  }
}

const DONE = { decide: "Decided.", accept: "Accepted everything without a flag.", undo: "Undone.", answer: "Answered.", sign: "Signed.", reopen: "Re-opened.", note: "Written." };

function signNote({ may, signed, counts, own, ready }) {
  if (signed) return may.includes("reopen") ? "Re-open it, with a reason, if something must be decided anew." : "An approver can re-open it.";
  if (!ready) return counts.results ? `Before it can be signed: ${plural(counts.undecided, "result")} to decide and ${counts.held} on hold.` : "There is nothing to sign.";
  if (own) return "You decided here, so somebody else signs.";
  return may.includes("sign") ? "All is decided. Look at the rejections, then sign." : "All is decided; it waits for an approver.";
}

try {
  window.reviewPage = new Page(await load(config.data));
  root.dataset.ready = "yes";
} catch (refusal) { say(refusal.message, "error"); throw refusal; }
