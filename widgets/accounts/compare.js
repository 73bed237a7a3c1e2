// Two accounts side by side, finding by finding: what tells them apart.
import { fixed, freshId, h, mark, number, percent } from "../front/kit.js";
import { grade, redo, signName } from "./parts.js";

/** Two choices and a table; `change(accounts)` brings it up to date. */
export function makeComparison(words) {
  const chosen = [null, null];
  let accounts = [];
  const selects = [0, 1].map((i) => {
    const id = freshId("compare");
    const select = h("select", { id, onchange: () => { chosen[i] = select.value; draw(); } });
    return { select, node: h("p", { class: "bw-compare-choice" }, h("label", { for: id, class: "bw-rank-tag" }, i ? words.second_account : words.first_account), " ", select) };
  });
  const table = h("div", { class: "bw-part-body" });
  const node = h("div", { class: "bw-compare" }, h("p", { class: "bw-soft" }, words.compare_hint), selects.map((each) => each.node), table);

  function change(now) {
    accounts = now;
    for (const [i, { select }] of selects.entries()) {
      redo(select, accounts.map((a) => [a.key, a.index, a.title]), () => accounts.map((a) => h("option", { value: a.key }, `${a.index + 1}. ${a.title}`)));
      const plain = accounts.findIndex((a) => a.is_plain);
      if (!accounts.some((a) => a.key === chosen[i])) chosen[i] = accounts[i === 0 ? 0 : plain > 0 ? plain : Math.min(1, accounts.length - 1)]?.key ?? null;
      if (chosen[i] !== null) select.value = chosen[i];
    }
    draw();
  }

  function draw() {
    const [a, b] = chosen.map((key) => accounts.find((account) => account.key === key));
    if (!a || !b) return;
    redo(table, [a.ledger, b.ledger, a.index, b.index], () => [compared(a, b, words)]);
  }

  return { node, change };
}

function compared(a, b, words) {
  const other = new Map(b.ledger.map((row) => [`${row.sign}@${row.side}`, row]));
  const rows = a.ledger.map((row) => ({ row, rival: other.get(`${row.sign}@${row.side}`), gap: row.loglik - other.get(`${row.sign}@${row.side}`).loglik }));
  const most = Math.max(1, ...rows.map(({ gap }) => Math.abs(gap)));
  rows.sort((x, y) => (x.row.row === "finding" ? 0 : 1) - (y.row.row === "finding" ? 0 : 1) || Math.abs(y.gap) - Math.abs(x.gap));
  const sum = rows.reduce((total, { gap }) => total + gap, 0);
  const body = rows.map(({ row, rival, gap }) => {
    const id = `${row.sign}@${row.side}`;
    const seen = row.found ? grade(row.found, words) : null;
    const width = (Math.abs(gap) / most) * 50;
    return h("tr", { "data-row": row.row }, h("th", { scope: "row" }, words[`ledger_${row.row}`] || signName(row, words)), h("td", {}, seen),
      h("td", { class: "bw-right" }, seen ? number(`accounts/${a.index}/ledger/${id}/p_sign`, row.p_sign, percent(row.p_sign)) : null),
      h("td", { class: "bw-right" }, seen ? number(`accounts/${b.index}/ledger/${id}/p_sign`, rival.p_sign, percent(rival.p_sign)) : null),
      h("td", { class: "bw-balance-cell" }, h("span", { class: "bw-balance", "aria-hidden": "true" },
        h("i", { class: gap >= 0 ? "bw-for" : "bw-against", style: `left:${gap >= 0 ? 50 - width : 50}%;width:${width}%` }))),
      h("td", { class: "bw-right" }, `${gap >= 0 ? words.for_first : words.for_second} ${fixed(Math.abs(gap), 2)}`));
  });
  return h("table", { class: "bw-ledger" },
    h("thead", {}, h("tr", {}, h("th", { scope: "col" }, words.sign), h("th", { scope: "col" }, words.found), h("th", { scope: "col", class: "bw-right" }, `${words.p_sign} ${words.first_account}`),
      h("th", { scope: "col", class: "bw-right" }, `${words.p_sign} ${words.second_account}`), h("th", { scope: "col", colspan: 2, title: words.gap_hint }, words.gap))),
    h("tbody", {}, body),
    h("tfoot", {}, h("tr", {}, h("th", { scope: "row", colspan: 5 }, words.sum), h("td", { class: "bw-right" }, `${sum >= 0 ? words.for_first : words.for_second} ${fixed(Math.abs(sum), 2)}`))));
}
