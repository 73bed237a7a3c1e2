// What an account explains and leaves, and its ledger: every finding with how well the account predicts it.
import { fixed, h, number, percent, s } from "../front/kit.js";
import { grade, signName } from "./parts.js";

/** One of the lists of a card: explained, left, or expected in vain. */
export function column(kind, title, items, words, none) {
  const sign = { explains: "M2.5 8.5 6.5 12.5 13.5 4", leaves: "M8 3a5 5 0 1 0 .01 0", absent: "M4 4 12 12 M12 4 4 12" }[kind];
  const icon = () => s("svg", { class: "bw-fit-icon", viewBox: "0 0 16 16", "aria-hidden": "true" }, s("path", { d: sign }));
  return h("div", { class: `bw-fit bw-fit-${kind}` }, h("h3", {}, title),
    items.length
      ? h("ul", {}, items.map((item) => h("li", {}, icon(), h("span", {}, signName(item, words),
        kind === "absent" ? null : [" ", grade(item.found, words)]))))
      : h("p", { class: "bw-soft" }, none));
}

/** The ledger of an account; `path` is where its numbers stand in the API. */
export function ledger(account, words, base) {
  const most = Math.max(1, ...account.ledger.map((row) => Math.abs(row.vs_cortical || 0)));
  const rows = account.ledger.map((row) => {
    const path = `${base}/ledger/${row.sign}@${row.side}`;
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
    h("tfoot", {}, sumRow(account, words, base)));
}

function sumRow(account, words, base) {
  const path = `${base}/ledger_sum`;
  return h("tr", {}, h("th", { scope: "row", colspan: 3 }, words.sum),
    h("td", { class: "bw-right" }, number(`${path}/loglik`, account.ledger_sum.loglik, fixed(account.ledger_sum.loglik, 2))),
    h("td", {}), h("td", { class: "bw-right" }, number(`${path}/vs_cortical`, account.ledger_sum.vs_cortical, signed(account.ledger_sum.vs_cortical))));
}

function signed(value) {
  return value > 0 ? `+${fixed(value, 2)}` : fixed(value, 2);
}
