// One account as a card: what it says, what it explains and leaves, why, and on which evidence.
import { fill, fixed, freshId, h, mark, number, odds, percent, s, say, setNumber } from "../front/kit.js";
import { chip, claimList, grade, redo, signName } from "./parts.js";

function column(kind, title, items, words, none) {
  const sign = { explains: "M2.5 8.5 6.5 12.5 13.5 4", leaves: "M8 3a5 5 0 1 0 .01 0", absent: "M4 4 12 12 M12 4 4 12" }[kind];
  const icon = () => s("svg", { class: "bw-fit-icon", viewBox: "0 0 16 16", "aria-hidden": "true" }, s("path", { d: sign }));
  return h("div", { class: `bw-fit bw-fit-${kind}` }, h("h3", {}, title),
    items.length
      ? h("ul", {}, items.map((item) => h("li", {}, icon(), h("span", {}, signName(item, words),
        kind === "absent" ? null : [" ", grade(item.found, words)]))))
      : h("p", { class: "bw-soft" }, none));
}

function ledger(account, words) {
  const most = Math.max(1, ...account.ledger.map((row) => Math.abs(row.vs_cortical || 0)));
  const rows = account.ledger.map((row) => {
    const path = `accounts/${account.index}/ledger/${row.sign}@${row.side}`;
    const width = (Math.abs(row.vs_cortical || 0) / most) * 50;
    const left = row.vs_cortical >= 0 ? 50 : 50 - width;
    const seen = row.found ? grade(row.found, words) : null;
    return h("tr", { "data-row": row.row }, h("th", { scope: "row" }, words[`ledger_${row.row}`] || signName(row, words)), h("td", {}, seen),
      h("td", { class: "bw-right" }, seen ? number(`${path}/p_sign`, row.p_sign, percent(row.p_sign)) : null),
      h("td", { class: "bw-right" }, number(`${path}/loglik`, row.loglik, fixed(row.loglik, 2))),
      h("td", { class: "bw-balance-cell" }, h("span", { class: "bw-balance", "aria-hidden": "true" },
        h("i", { class: row.vs_cortical >= 0 ? "bw-for" : "bw-against", style: `left:${left}%;width:${width}%` }))),
      h("td", { class: "bw-right" }, number(`${path}/vs_cortical`, row.vs_cortical, signed(row.vs_cortical))));
  });
  return h("table", { class: "bw-ledger" },
    h("thead", {}, h("tr", {}, h("th", { scope: "col" }, words.sign), h("th", { scope: "col" }, words.found),
      h("th", { scope: "col", class: "bw-right", title: words.p_sign_hint }, words.p_sign),
      h("th", { scope: "col", class: "bw-right", title: words.loglik_hint }, words.loglik),
      h("th", { scope: "col", colspan: 2, title: words.vs_cortical_hint }, words.vs_cortical))),
    h("tbody", {}, rows),
    h("tfoot", {}, sumRow(account, words)));
}

function sumRow(account, words) {
  const path = `accounts/${account.index}/ledger_sum`;
  return h("tr", {}, h("th", { scope: "row", colspan: 3 }, words.sum),
    h("td", { class: "bw-right" }, number(`${path}/loglik`, account.ledger_sum.loglik, fixed(account.ledger_sum.loglik, 2))),
    h("td", {}), h("td", { class: "bw-right" }, number(`${path}/vs_cortical`, account.ledger_sum.vs_cortical, signed(account.ledger_sum.vs_cortical))));
}

function signed(value) {
  return value > 0 ? `+${fixed(value, 2)}` : fixed(value, 2);
}

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
    redo(book.body, [a.ledger, a.index], () => [ledger(a, words)]);
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
