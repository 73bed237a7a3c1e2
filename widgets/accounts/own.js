// The user's own account: a form on the left, its standing beside the other accounts on the right.
import { frame, freshId, h, keep, mark, number, odds, percent, say, setNumber, watch } from "../front/kit.js";
import { column, ledger } from "./ledger.js";
import { redo } from "./parts.js";

function field(label, input) {
  input.id = freshId("own");
  return h("div", { class: "bw-own-field" }, h("label", { for: input.id, class: "bw-soft" }, label), input);
}

function render({ model, el }) {
  const words = model.get("words");
  const clear = h("button", { type: "button", class: "bw-button", onclick: () => put({ title: "", text: "", elements: [], scenario: {} }) }, words.clear);
  const store = h("button", { type: "button", class: "bw-button", onclick: () => model.send({ kind: "keep" }) }, words.keep);
  const { panel, body } = frame(el, words, "own", clear, store);
  const title = h("input", { type: "text", class: "bw-search bw-wide", maxlength: 200, onchange: () => put({ title: title.value }) });
  const text = h("textarea", { class: "bw-own-text", rows: 4, onchange: () => put({ text: text.value }) });
  const author = h("input", { type: "text", class: "bw-search bw-wide", maxlength: 80, onchange: () => { model.set("author", author.value); model.save_changes(); draw(); } });
  const axes = Object.entries(model.get("axes")).map(([axis, values]) => {
    const select = h("select", { onchange: () => {
      const scenario = { ...draft().scenario };
      if (select.value === values[0]) delete scenario[axis];
      else scenario[axis] = select.value;
      put({ scenario });
    } }, values.map((value) => h("option", { value }, words[`${axis}_${value}`])));
    return { axis, usual: values[0], select, node: field(words[`axis_${axis}`] || words[`axis_${axis}_own`], select) };
  });
  const list = h("div", { class: "bw-own-elements", role: "group", "aria-label": words.elements });
  const saved = h("ul", { class: "bw-own-kept" });
  const savedHead = h("h3", {}, words.kept);
  const form = h("div", { class: "bw-own-form" }, field(words.name, title), h("h3", {}, words.elements), h("p", { class: "bw-soft" }, words.elements_hint), list,
    h("h3", {}, words.settings), axes.map((each) => each.node), field(words.why, text), field(words.author, author), savedHead, saved);
  const posterior = number(), against = number();
  const verbal = h("span", { class: "bw-verbal" });
  const bar = h("i", {});
  const fit = h("div", { class: "bw-fits" });
  const book = h("div", { class: "bw-part-body" });
  const outcome = h("div", { class: "bw-card" }, h("p", { class: "bw-own-line" }, h("span", { class: "bw-card-posterior" }, posterior), " ", h("span", { class: "bw-soft" }, words.beside)),
    h("div", { class: "bw-posterior", "aria-hidden": "true" }, bar), h("p", {}, verbal, h("span", { class: "bw-soft" }, " · ", against, ` ${words.against_plain}`)), fit, h("h3", { class: "bw-own-ledger" }, words.ledger), book);
  const empty = h("p", { class: "bw-empty" }, words.nothing_yet);
  body.append(h("div", { class: "bw-own-split" }, form, h("div", {}, outcome, empty)));

  const draft = () => ({ title: "", text: "", elements: [], scenario: {}, ...model.get("draft") });

  function put(change) {
    model.set("draft", { ...draft(), ...change });
    model.save_changes();
    draw();
  }

  function element(item) {
    const id = freshId("own-element");
    const box = h("input", { type: "checkbox", id, onchange: () => {
      const rest = draft().elements.filter((each) => each !== item.id);
      put({ elements: box.checked ? [...rest, item.id] : rest });
    } });
    const share = number();
    const node = h("div", { class: "bw-own-element" }, box, h("label", { for: id }, item.name, " ", h("span", { class: "bw-side" }, words[`${item.side}_short`])), share);
    node.change = (now) => {
      box.checked = draft().elements.includes(now.id);
      setNumber(share, `damage/${now.id}/share`, now.share, percent(now.share));
    };
    return node;
  }

  function page(item) {
    return h("li", {}, h("button", { type: "button", class: "bw-button", onclick: () => put({ title: item.title, text: item.text || "", elements: item.elements || [], scenario: item.scenario || {} }) }, item.title),
      h("span", { class: "bw-soft" }, ` ${item.author}, ${item.time.slice(0, 10)}`));
  }

  function draw() {
    const now = draft();
    if (document.activeElement !== title) title.value = now.title;
    if (document.activeElement !== text) text.value = now.text;
    if (document.activeElement !== author) author.value = model.get("author");
    for (const { axis, usual, select } of axes) select.value = now.scenario[axis] || usual;
    keep(list, model.get("offered"), (item) => item.id, element, (node, item) => node.change(item));
    keep(saved, model.get("kept"), (item) => item.id, page);
    savedHead.hidden = model.get("kept").length === 0;
    store.hidden = !model.get("can_keep");
    store.disabled = !now.title.trim() || !model.get("author").trim();
    mark(store, "title", store.disabled ? words.keep_needs : words.keep_hint);
    const told = model.get("told");
    const any = told.posterior_beside !== undefined;
    outcome.hidden = !any;
    empty.hidden = any;
    if (any) {
      setNumber(posterior, "own/posterior_beside", told.posterior_beside, percent(told.posterior_beside));
      bar.style.width = `${told.posterior_beside * 100}%`;
      say(verbal, told.words);
      setNumber(against, "own/odds_vs_cortical", told.odds_vs_cortical, odds(told.odds_vs_cortical));
      redo(fit, [told.explains, told.leaves, told.predicts_absent], ([yes, left, missing]) => [column("explains", words.explains, yes, words, words.explains_none),
        column("leaves", words.leaves, left, words, words.leaves_none), column("absent", words.predicts_absent, missing, words, words.predicts_absent_none)]);
      redo(book, told.ledger, () => [ledger(told, words, "own")]);
    }
    mark(panel, "data-stamp", model.get("stamp"));
  }

  return watch(model, ["draft", "author", "offered", "kept", "can_keep", "told", "stamp"], draw);
}

export default { render };
