// One account as a card: what it says, what it explains and leaves, why, and on which evidence.
import { freshId, h, mark, number, odds, percent, say, setNumber } from "../front/kit.js";
import { column, ledger } from "./ledger.js";
import { chip, claimList, redo, signName } from "./parts.js";

function counterfactuals(account, words, select) {
  return h("ul", { class: "bw-whatif" }, account.counterfactuals.map((row, i) => h("li", {}, chip(row.element, words, select), " ",
    signName(row, words), " ", number(`accounts/${account.index}/counterfactuals/${i}/change`, row.change,
      `${row.change > 0 ? "+" : "\u2212"}${Math.round(Math.abs(row.change) * 100)}`), ` ${words.points}`)));
}

function part(name, words, more) {
  const count = h("span", { class: "bw-soft" });
  const body = h("div", { class: "bw-part-body" });
  const node = h("details", { class: "bw-part", "data-part": name }, h("summary", {}, words[name], " ", count), more ? h("p", { class: "bw-soft" }, more) : null, body);
  return Object.assign(node, { count, body });
}

/** Makes a card; `card.change(account)` brings it up to date in place. */
export function makeCard(account, words, select, act) {
  const titleId = freshId("account");
  const rank = h("span", { class: "bw-rank", "aria-hidden": "true" });
  const title = h("span", { class: "bw-card-title", id: titleId });
  const kind = h("span", { class: "bw-tag" });
  const posterior = number();
  const verbal = h("span", { class: "bw-verbal" });
  const against = number();
  const againstText = h("span", { class: "bw-soft" });
  const bar = h("i", {});
  const body = h("div", { class: "bw-card-body" });
  const toggle = h("button", { type: "button", class: "bw-card-head", "aria-labelledby": titleId, onclick: () => open(body.hidden) },
    rank, h("span", { class: "bw-card-name" }, title, " ", kind), h("span", { class: "bw-card-posterior" }, posterior));
  const scale = h("div", { class: "bw-posterior", "aria-hidden": "true" }, bar);
  const line = h("p", { class: "bw-card-line" }, verbal, againstText);
  const node = h("article", { class: "bw-card", "aria-labelledby": titleId, "data-account": account.key }, h("h3", { class: "bw-card-heading" }, toggle), scale, line, body);

  const elements = h("div", { class: "bw-chips" });
  const fit = h("div", { class: "bw-fits" });
  const neck = h("div", { class: "bw-necks" });
  const book = part("ledger", words, words.ledger_hint);
  const change = part("counterfactuals", words, words.counterfactuals_hint);
  const pro = part("claims_for", words);
  const con = part("claims_against", words);
  const spared = part("sparing", words, words.sparing_hint);
  const notes = h("ul", { class: "bw-cautions" });
  body.append(elements, fit, neck, notes, h("div", { class: "bw-parts" }, book, change, spared, pro, con));
  if (act) body.append(act(account));

  function open(yes) {
    body.hidden = !yes;
    mark(toggle, "aria-expanded", yes ? "true" : "false");
  }

  node.open = open;
  node.change = (a) => {
    const path = `accounts/${a.index}`;
    say(rank, a.index + 1);
    say(title, a.title);
    say(kind, words[`account_${a.kind}`] || a.kind);
    mark(node, "data-kind", a.kind);
    setNumber(posterior, `${path}/posterior`, a.posterior, percent(a.posterior));
    bar.style.width = `${a.posterior * 100}%`;
    say(verbal, a.words);
    setNumber(against, `${path}/odds_vs_cortical`, a.odds_vs_cortical, odds(a.odds_vs_cortical));
    if (!againstText.firstChild) againstText.append(" · ", against, ` ${words.against_plain}`);
    againstText.hidden = a.is_plain;
    redo(elements, a.elements, (all) => all.map((element) => chip(element, words, select)));
    elements.hidden = a.elements.length === 0;
    redo(fit, [a.explains, a.leaves, a.predicts_absent], ([yes, left, missing]) => [
      column("explains", words.explains, yes, words, words.explains_none),
      column("leaves", words.leaves, left, words, words.leaves_none),
      column("absent", words.predicts_absent, missing, words, words.predicts_absent_none)]);
    redo(neck, [a.bottlenecks, a.index], ([all]) => all.map((b) => h("p", {}, h("span", { class: "bw-neck-mark", "aria-hidden": "true" }),
      `${b.words}. `, h("span", { class: "bw-soft bw-nowrap" }, `${words.capacity} `,
        number(`${path}/bottlenecks/${b.function}/capacity`, b.capacity, percent(b.capacity))))));
    redo(book.body, [a.ledger, a.index], () => [ledger(a, words, path)]);
    redo(change.body, [a.counterfactuals, a.index], () => [counterfactuals(a, words, select)]);
    change.hidden = a.counterfactuals.length === 0;
    redo(spared.body, a.sparing, (all) => [h("ul", { class: "bw-plain-list" }, all.map((text) => h("li", {}, text)))]);
    spared.hidden = a.sparing.length === 0;
    redo(pro.body, a.claims_for, (claims) => [claimList(claims, words)]);
    redo(con.body, a.claims_against, (claims) => [claims.length ? claimList(claims, words) : h("p", { class: "bw-soft" }, words.claims_against_none)]);
    say(pro.count, a.claims_for.length);
    say(con.count, a.claims_against.length);
    redo(notes, a.cautions, (all) => all.map((text) => h("li", {}, text)));
    notes.hidden = a.cautions.length === 0;
  };
  node.change(account);
  open(false);
  return node;
}
