// Rival models: named sets of overlays, one in use, two compared on the open case.
import { fill, fixed, freshId, h, keep, mark, percent, say } from "../front/kit.js";
import { drawPicture } from "./picture.js";

export function makeRivals(env) {
  const { words, send } = env;
  const title = (name) => name || words.model_base;
  const list = h("ul", { class: "be-entries" });
  const name = h("input", { type: "text", class: "bw-search be-word", "aria-label": words.model_name, placeholder: words.model_name, oninput: () => ready() });
  const boxes = h("div", { class: "be-checks", role: "group", "aria-label": words.model_overlays });
  const none = h("p", { class: "bw-soft" }, words.no_overlays);
  const make = h("button", { type: "button", class: "bw-button", disabled: true, onclick: () => send({ kind: "model", name: name.value, overlays: [...boxes.querySelectorAll("input:checked")].map((box) => box.value) }) }, words.model_keep);
  const ready = () => { make.disabled = name.value.trim() === ""; };
  const chooser = (label) => {
    const id = freshId("model");
    const select = h("select", { id });
    return { select, node: h("span", { class: "be-row" }, h("label", { for: id, class: "bw-soft" }, label), select) };
  };
  const [first, second] = [chooser(words.model_first), chooser(words.model_second)];
  const compare = h("button", { type: "button", class: "bw-button", onclick: () => {
    mark(told, "data-stage", "waits");
    say(told, words.effect_waits);
    send({ kind: "compare", first: first.select.value, second: second.select.value });
  } }, words.model_compare);
  const told = h("p", { class: "be-effect-words", role: "status" });
  const result = h("div", { class: "be-compared" });
  const node = h("div", { class: "be-review" }, h("section", {}, h("p", { class: "bw-soft" }, words.models_hint), list,
    h("div", { class: "be-row" }, name, make), none, boxes), h("section", {}, h("div", { class: "be-row" }, first.node, second.node, compare), told, result));

  function show(now) {
    if (!now.models) return;
    const models = [{ name: "", overlays: [] }, ...now.models];
    keep(list, models, (model) => `${model.name} ${model.overlays.join()} ${now.used.join() === model.overlays.join()}`, (model) => {
      const used = now.used.join() === model.overlays.join();
      return h("li", { class: "be-entry" }, h("div", { class: "be-row" }, h("span", { class: "be-entry-words" }, title(model.name)), h("span", { class: "bw-soft" }, model.overlays.join(", ")),
        used ? h("span", { class: "bw-tag" }, words.model_used) : h("button", { type: "button", class: "be-small", "aria-label": `${words.model_switch}: ${title(model.name)}`, onclick: () => send({ kind: "switch", name: model.name }) }, words.model_switch)));
    });
    none.hidden = now.files.length > 0;
    keep(boxes, now.files, (path) => path, (path) => {
      const id = freshId("overlay");
      return h("span", { class: "be-check" }, h("input", { type: "checkbox", id, value: path, checked: now.used.includes(path) }), h("label", { for: id }, path));
    });
    for (const { select } of [first, second]) {
      const before = select.value;
      select.replaceChildren(...models.map((model) => h("option", { value: model.name }, title(model.name))));
      if (models.some((model) => model.name === before)) select.value = before;
    }
    if (first.select.value === second.select.value && models.length > 1) second.select.value = models[models.length - 1].name;
    compare.disabled = models.length < 2;
    if (now.compared) compared(now.compared);
  }

  function compared(now) {
    mark(told, "data-stage", "done");
    say(told, now.words);
    const [a, b] = [now.first === "base" ? words.model_base : now.first, now.second === "base" ? words.model_base : now.second];
    const findings = h("table", { class: "be-effect" }, h("thead", {}, h("tr", {}, h("th", { scope: "col" }, words.model_finding), h("th", { scope: "col" }, fill(words.model_log, { name: a })),
      h("th", { scope: "col" }, fill(words.model_log, { name: b })), h("th", { scope: "col" }, words.model_fits))), h("tbody", {}, now.findings.map((row) => h("tr", {}, h("th", { scope: "row" }, row.name, row.found ? h("span", { class: "bw-soft" }, ` ${words[row.found] || row.found}`) : null),
      h("td", {}, h("span", { class: "bw-number" }, fixed(row.first, 2))), h("td", {}, h("span", { class: "bw-number" }, fixed(row.second, 2))),
      h("td", {}, row.fits === now.first ? a : row.fits === now.second ? b : "")))));
    const ranking = h("table", { class: "be-effect" }, h("thead", {}, h("tr", {}, h("th", { scope: "col" }, words.effect_account), h("th", { scope: "col" }, a), h("th", { scope: "col" }, b))),
      h("tbody", {}, now.ranking.map((row) => h("tr", { class: Math.abs(row.change) >= 0.005 ? "be-moved" : "" }, h("th", { scope: "row" }, row.title), [row.before, row.after].map((amount) => h("td", {}, h("span", { class: "be-bar", style: `--share: ${amount || 0}` }),
        h("span", { class: "bw-number" }, amount === null ? words.not_shown : percent(amount))))))));
    result.replaceChildren(findings, h("h3", {}, words.model_ranking), h("p", {}, now.ranking_words), ranking, h("h3", {}, words.model_differ),
      h("ul", { class: "be-changes" }, now.changes.map((change) => h("li", {}, change.words))), ...(now.picture.nodes.length ? [drawPicture(now.picture, words)] : []));
  }
  return { node, show };
}
