// How steady the ranking is under small changes, and what reserve is left.
import { fill, frame, h, mark, number, percent, say, selector, watch } from "../front/kit.js";
import { chip, claimList, redo } from "./parts.js";

function table(told, words) {
  const kinds = ["mask", "finding", "prior"];
  const rows = told.rows.map((row, i) => ({ ...row, i })).sort((a, b) => kinds.indexOf(a.kind) - kinds.indexOf(b.kind) || a.p_usual_first - b.p_usual_first);
  return h("table", { class: "bw-ledger bw-steady" },
    h("thead", {}, h("tr", {}, h("th", { scope: "col" }, words.change), h("th", { scope: "col", class: "bw-right" }, words.leader_then), h("th", { scope: "col" }, words.first_then))),
    h("tbody", {}, rows.map((row) => h("tr", { class: row.flips ? "bw-flips" : "" }, h("th", { scope: "row" }, h("span", { class: "bw-tag" }, words[`changed_${row.kind}`]), " ", row.change),
      h("td", { class: "bw-right" }, number(`steady/${row.i}/p_usual_first`, row.p_usual_first, percent(row.p_usual_first))),
      h("td", {}, row.flips ? [h("span", { class: "bw-turn" }, words.turns_over), ` ${row.first}`] : words.still_first)))));
}

function render({ model, el }) {
  const words = model.get("words");
  const select = selector(model);
  const examine = h("button", { type: "button", class: "bw-button", onclick: () => { say(status, words.thinking); model.send({ kind: "examine" }); } }, words.examine);
  const status = h("span", { class: "bw-soft", role: "status" });
  const { panel, body } = frame(el, words, "steady", status, examine);
  const verdict = h("p", { class: "bw-steady-words" });
  const changes = h("div", { class: "bw-part-body" });
  const hint = h("p", { class: "bw-soft" }, words.hint);
  const spared = h("div", {});
  body.append(h("h3", {}, words.steadiness), hint, verdict, changes, h("h3", { class: "bw-steady-reserve" }, words.reserve), h("p", { class: "bw-soft" }, model.get("careful")), spared);

  function reserveList(rows) {
    return h("ul", { class: "bw-reserve" }, rows.map((row) => h("li", {}, h("p", {}, h("strong", {}, row.function), " ", chip(row.element, words, select)),
      h("p", {}, row.words), row.claims.length ? claimList(row.claims, words) : null)));
  }

  function draw() {
    const told = model.get("told");
    const any = Boolean(told.rows);
    say(verdict, any ? told.words : "");
    verdict.hidden = !any;
    hint.hidden = any;
    mark(verdict, "data-easily", any && told.easily ? "true" : null);
    redo(changes, told, () => (any ? [table(told, words)] : []));
    examine.disabled = !model.get("ready");
    const progress = model.get("progress");
    if (progress > 0) say(status, fill(words.progress, { share: percent(progress) }));
    else if (any || !model.get("ready")) say(status, "");
    const rows = model.get("spared");
    redo(spared, rows, () => {
      if (!rows.length) return [h("p", { class: "bw-soft" }, words.reserve_none)];
      const others = rows.filter((row) => !row.asked);
      return [reserveList(rows.filter((row) => row.asked)),
        others.length ? h("details", { class: "bw-part" }, h("summary", {}, fill(words.reserve_others, { count: others.length })), reserveList(others)) : null];
    });
    mark(panel, "data-stamp", model.get("stamp"));
  }

  return watch(model, ["told", "spared", "progress", "ready", "stamp"], draw);
}

export default { render };
