// The team's side of the bench: notes, where everybody stands, the course over visits, and versions to choose from.
import { frame, freshId, h, mark, say, segmented, watch } from "../front/kit.js";
import { makeCourse } from "./course.js";
import { makeNotes } from "./list.js";
import { makeStanding } from "./standing.js";
import { makeVersions } from "./versions.js";

function render({ model, el }) {
  const words = model.get("words");
  let number = 0;
  let view = "notes";
  const youId = freshId("you");
  const you = h("input", { id: youId, class: "bw-search bw-you", type: "text", maxlength: 80, title: words.you_hint, autocomplete: "off", onchange: () => tell({ kind: "author", name: you.value }) });
  const views = segmented(words.views, ["notes", "standing", "course", "versions"].map((name) => [name, words[`view_${name}`]]), view, (name) => {
    view = name;
    draw();
  });
  const { panel, body } = frame(el, words, "notes", h("span", { class: "bw-note-field" }, h("label", { for: youId, class: "bw-soft" }, words.you), you), views);
  const notes = makeNotes(words, tell);
  const standing = makeStanding(words, tell);
  const course = makeCourse(words, tell);
  const versions = makeVersions(words, tell);
  const parts = { notes: notes.node, standing: standing.node, course: course.node, versions: versions.node };
  const empty = h("p", { class: "bw-empty" }, words.no_folder);
  body.append(...Object.values(parts), empty);

  function tell(message) {
    if (message.kind !== "author" && you.value.trim() !== model.get("author")) model.send({ kind: "author", name: you.value });
    if (message.kind === "open" && message.anchor.kind === "account") {
      view = "standing";
      views.show(view);
      draw();
      standing.show(message.anchor.key);
    }
    number += 1;
    model.send({ ...message, number });
  }

  function draw() {
    const told = model.get("told") || {};
    const there = told.folder === true;
    for (const [name, node] of Object.entries(parts)) node.hidden = !there || name !== view;
    empty.hidden = there;
    you.disabled = !there;
    if (there) {
      const me = model.get("author");
      notes.change(told, model.get("here"), model.get("places"), me);
      standing.change(told.standing, me);
      course.change(told.visits, model.get("course"));
      versions.change(told.versions);
      const tab = [...views.children].find((button) => button.dataset.key === "versions");
      say(tab, told.versions.length ? `${words.view_versions} (${told.versions.length})` : words.view_versions);
    }
    mark(panel, "data-stamp", model.get("stamp"));
  }

  function name() {
    if (document.activeElement !== you) you.value = model.get("author");
    draw();
  }

  const stops = [watch(model, ["told", "here", "places", "course", "stamp"], draw), watch(model, ["author"], name)];
  return () => stops.forEach((stop) => stop());
}

export default { render };
