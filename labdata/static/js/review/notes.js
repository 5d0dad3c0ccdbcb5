// The thread of a flag: what was said, what was asked of the laboratory, and a form to add to it.

import { make, when } from "./dom.js";

const NAMES = { note: "", question: "asked the laboratory", answer: "the laboratory answered" };

/** A closed thread that opens in place; `panel`: {model, notes, send, talking}. */
export function thread(flag, panel) {
  const { model, talking } = panel, said = model.data.notes.filter((note) => note.rule === flag.rule && note.mark === flag.mark);
  if (!said.length && !model.data.may_note) return null;
  const key = `${flag.rule} ${flag.mark}`, open = said.some((note) => note.open);
  const box = make("details", { class: "more thread" }, make("summary", {}, `Notes${said.length ? ` (${said.length}${open ? ", a question is open" : ""})` : ""}`));
  box.addEventListener("toggle", () => { if (box.open) talking.add(key); else talking.delete(key); });
  box.append(...(said.length ? [make("ol", { class: "notes" }, ...said.map((note) => one(note, panel)))] : []));
  if (model.data.may_note) box.append(form("Write", ["note", "question"], (words, kind) => panel.send("note", { flags: [[flag.rule, flag.mark]], kind, text: words })));
  box.open = talking.has(key);
  return box;
}

function one(note, panel) {
  const item = make("li", { class: `note-${note.kind}` }, make("p", { class: "small muted" }, [note.by, NAMES[note.kind], when(note.at)].filter(Boolean).join(", ")), make("p", { class: "words" }, note.text));
  if (note.kind === "question") item.append(make("p", { class: "small" }, make("a", { href: `${panel.notes}${note.id}.txt`, download: true }, "Text for the laboratory"), note.open ? " · no answer yet" : " · answered"));
  if (note.open && panel.model.data.may_note) {
    const more = make("details", { class: "more" }, make("summary", {}, "Write down the answer"));
    more.append(form("Write down", ["answer"], (words) => panel.send("note", { answers: note.id, kind: "answer", text: words })));
    item.append(more);
  }
  return item;
}

function form(label, kinds, send) {
  const words = make("textarea", { name: "text", rows: 2, required: true, maxlength: 4000 });
  const made = make("form", { class: "note-form" }, make("label", {}, kinds[0] === "answer" ? "What the laboratory says" : "Your note or question", words));
  if (kinds.length > 1) made.append(make("label", { class: "tick" }, make("input", { type: "checkbox", name: "ask" }), "a question to the laboratory"));
  made.append(make("button", { type: "submit", class: "small" }, label));
  made.addEventListener("submit", (event) => {
    event.preventDefault();
    send(words.value, made.elements.ask?.checked ? "question" : kinds[0]);
  });
  return made;
}
