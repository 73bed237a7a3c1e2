// Where each person stands on each account, beside what the posterior says.
import { fill, h, keep, mark, number, percent, say, segmented, setNumber } from "../front/kit.js";

const STANDS = ["held", "doubted", "ruled_out"];

function makeRow(row, words, tell) {
  const posterior = number();
  const bar = h("i", {});
  const title = h("strong", { class: "bw-stand-title" });
  const flags = h("span", {});
  const people = h("dl", { class: "bw-stand-people" });
  const reason = h("input", { class: "bw-search bw-stand-reason", type: "text", placeholder: words.reason, "aria-label": words.reason });
  const mineNow = segmented(words.stand, STANDS.map((stands) => [stands, words[stands]]), "",
    (stands) => tell({ kind: "stand", account: row.account, stands, reason: reason.value }));
  const node = h("article", { class: "bw-stand", "data-account": row.account, tabindex: "-1" },
    h("div", { class: "bw-stand-head" }, title, " ", flags, h("span", { class: "bw-stand-posterior" }, posterior)),
    h("div", { class: "bw-stand-bar", "aria-hidden": "true" }, bar), people,
    h("div", { class: "bw-stand-mine" }, h("span", { class: "bw-soft" }, words.stand), mineNow, reason));
  node.change = (now, me) => {
    say(title, now.title);
    if (now.index === null) say(posterior, words.not_now);
    else setNumber(posterior, `accounts/${now.index}/posterior`, now.posterior, percent(now.posterior));
    bar.style.width = `${(now.posterior || 0) * 100}%`;
    mark(node, "data-differ", now.differ ? "true" : null);
    flags.replaceChildren(...[now.differ ? h("span", { class: "bw-tag bw-stand-differ" }, words.differ) : null, " ",
      now.odd ? h("span", { class: "bw-tag" }, words.odd) : null].filter(Boolean));
    const own = STANDS.find((stands) => now[stands].some((one) => one.who === me));
    mineNow.show(own || "");
    people.replaceChildren(...STANDS.filter((stands) => now[stands].length).flatMap((stands) => [
      h("dt", { class: `bw-stand-${stands}` }, words[stands]),
      ...now[stands].map((one) => h("dd", {}, h("strong", {}, one.who), one.reason ? ` ${one.reason}` : ""))]));
  };
  return node;
}

/** The standing view; `change(rows, me)` brings it up to date; `show(account)` points one out. */
export function makeStanding(words, tell) {
  const line = h("p", { class: "bw-soft" });
  const rows = h("div", { class: "bw-stands" });
  const node = h("div", {}, h("p", { class: "bw-lead bw-soft" }, words.standing_lead), line, rows);

  function change(told, me) {
    const spoken = told.filter((row) => STANDS.some((stands) => row[stands].length));
    const count = told.filter((row) => row.differ).length;
    say(line, !spoken.length ? "" : count ? fill(words.some_differ, { count, all: spoken.length }) : words.all_agree);
    keep(rows, told, (row) => row.account, (row) => makeRow(row, words, tell), (item, row) => item.change(row, me));
  }

  function show(account) {
    const found = [...rows.children].find((row) => row.dataset.account === account);
    found?.scrollIntoView({ block: "nearest" });
    found?.focus({ preventScroll: true });
  }

  return { node, change, show };
}
