// Editing the graph: a form with its checks and its effect, review, rival models, coverage of knowledge.
import { fill, frame, freshId, h, mark, say, segmented, watch } from "../front/kit.js";
import { inOrder } from "../front/wire.js";
import { makeCoverage } from "./coverage.js";
import { makeForm } from "./form.js";
import { makeReview } from "./review.js";
import { makeRivals } from "./rivals.js";

function render({ model, el }) {
  const words = model.get("words");
  const send = (content) => model.send(content);
  const id = freshId("author");
  const author = h("input", { type: "text", id, class: "bw-search be-author", title: words.author_hint, maxlength: "80", onchange: () => author.value.trim() && send({ kind: "author", name: author.value }) });
  const undo = h("button", { type: "button", class: "bw-button be-undo", onclick: () => send({ kind: "undo" }) }, words.undo);
  const redo = h("button", { type: "button", class: "bw-button be-redo", onclick: () => send({ kind: "redo" }) }, words.redo);
  const { panel, body, foot } = frame(el, words, "editing", h("label", { for: id, class: "bw-soft" }, words.author), author, undo, redo);
  const message = h("p", { class: "be-message", role: "status", hidden: true });
  const again = h("button", { type: "button", class: "be-small", hidden: true, onclick: () => send({ kind: "reload" }) }, words.read_again);
  const empty = h("p", { class: "bw-empty" }, words.nothing);
  let shown = "edit";
  let slices = null;
  let slicesAsked = false;

  const env = {
    words, send,
    catalogue: () => model.get("catalogue") || {},
    fields: () => model.get("fields") || {},
    crosshair: () => model.get("crosshair"),
    shown: () => shown,
    open: (kind, key) => {
      go("edit");
      form.openRecord(kind, key);
    },
    slices: (box) => {
      if (slices) box.setSlices(slices);
      else if (!slicesAsked) {
        slicesAsked = true;
        send({ kind: "slices" });
      }
    },
  };
  const form = makeForm(env);
  const review = makeReview(env);
  const rivals = makeRivals(env);
  const coverage = makeCoverage(env);
  const pages = { edit: form.node, review: review.node, models: rivals.node, coverage: coverage.node };
  const tabs = segmented(words.tabs, Object.keys(pages).map((name) => [name, words[`tab_${name}`]]), shown, go);
  body.append(h("div", { class: "be-row be-top" }, tabs), message, again, empty, ...Object.values(pages));
  panel.addEventListener("keydown", (event) => {
    if (!(event.ctrlKey || event.metaKey) || event.key.toLowerCase() !== "z" || event.target.matches("input, textarea")) return;
    event.preventDefault();
    send({ kind: event.shiftKey ? "redo" : "undo" });
  });

  function go(name) {
    shown = name;
    tabs.show(name);
    for (const [key, node] of Object.entries(pages)) node.hidden = key !== name || !model.get("told").author;
    if (name === "coverage") send({ kind: "coverage" });
    if (name === "review") review.differ();
  }
  function tell(text, state) {
    message.hidden = !text;
    mark(message, "data-state", state);
    say(message, text);
  }
  let started = false;
  function session() {
    const told = model.get("told");
    empty.hidden = Boolean(told.author);
    for (const node of [tabs, author, undo, redo]) node.hidden = !told.author;
    if (!told.author) {
      go(shown);
      return;
    }
    if (author.getRootNode().activeElement !== author) author.value = told.author;
    undo.disabled = !told.undo;
    redo.disabled = !told.redo;
    say(foot, told.folder ? fill(words.written_to, { path: told.path }) : words.not_written);
    review.session(told);
    mark(panel, "data-entries", told.entries.length);
    mark(panel, "data-stamp", model.get("stamp"));
    if (!started) {
      started = true;
      go(shown);
      form.start();
    }
  }

  const hear = inOrder((said, arrays) => {
    if (said.kind === "slices") {
      slices = { data: arrays.data.data, shape: said.shape, low: said.low_mm, step: said.step_mm };
      form.setSlices(slices);
    } else if (said.kind === "sketch") form.sketched(said, arrays);
    else if (said.kind === "kept") {
      tell(fill(said.draft ? words.drafted : words.kept, { words: said.words.join("; ") }), "good");
      form.done(said);
    } else if (said.kind === "undo" || said.kind === "redo") {
      if (said.words) tell(fill(said.kind === "undo" ? words.undone : words.redone, { words: said.words }), "good");
      form.reopen();
    } else if (said.kind === "file") review.save(said);
    else if (said.kind === "fault") tell(said.text, "grave");
    again.hidden = said.kind !== "fault";
  });
  model.on("msg:custom", hear);
  const stops = [
    watch(model, ["told", "stamp"], session),
    watch(model, ["form"], () => form.opened(model.get("form"))),
    watch(model, ["trial"], () => model.get("trial").faults && form.judged(model.get("trial"))),
    watch(model, ["effect"], () => model.get("effect").stage && form.effected(model.get("effect"))),
    watch(model, ["differing"], () => review.difference(model.get("differing"))),
    watch(model, ["incoming"], () => review.visitor(model.get("incoming"))),
    watch(model, ["models"], () => rivals.show(model.get("models"))),
    watch(model, ["coverage"], () => coverage.show(model.get("coverage"))),
  ];
  return () => {
    stops.forEach((stop) => stop());
    model.off("msg:custom", hear);
    form.stop();
  };
}

export default { render };
