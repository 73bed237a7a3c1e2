// The accounts panel: rivals side by side, each as a card, then what would tell them apart.
import { fill, frame, h, keep, mark, number, percent, say, segmented, selector, setNumber, watch } from "../front/kit.js";
import { makeCard } from "./card.js";
import { makeComparison } from "./compare.js";
import { nextAxes, nextImages, nextTests } from "./next.js";
import { redo } from "./parts.js";

function share(account, words) {
  const node = h("button", { type: "button", class: "bw-share" });
  node.change = (a) => {
    node.style.flexGrow = String(Math.max(a.posterior, 0.004));
    mark(node, "data-rank", a.index < 6 ? a.index + 1 : "rest");
    mark(node, "data-plain", a.is_plain);
    const label = `${a.index + 1}. ${a.title}, ${percent(a.posterior)}`;
    mark(node, "title", label);
    mark(node, "aria-label", label);
    say(node, a.posterior > 0.05 ? a.index + 1 : "");
  };
  return node;
}

function render({ model, el }) {
  const words = model.get("words");
  const select = selector(model);
  const busy = h("span", { class: "bw-busy bw-soft", role: "status" });
  let view = "cards";
  const views = segmented(words.views, [["cards", words.view_cards], ["next", words.view_next], ["compare", words.view_compare]], view, (which) => {
    view = which;
    draw();
  });
  const { panel, body, foot } = frame(el, words, "accounts", busy, views);
  const unfound = h("p", { class: "bw-remark" }, words.no_findings);
  const remarks = h("div", { class: "bw-remarks", role: "note", "aria-label": words.remarks });
  const strip = h("div", { class: "bw-strip", role: "group", "aria-label": words.strip_label });
  const cards = h("div", { class: "bw-cards" });
  const others = h("p", { class: "bw-soft bw-others" });
  const more = h("button", { type: "button", class: "bw-button bw-more", onclick: () => { all = !all; draw(); } });
  const empty = h("p", { class: "bw-empty" }, words.nothing);
  const tests = h("section", { class: "bw-next", "aria-label": words.next_tests });
  const images = h("section", { class: "bw-next", "aria-label": words.next_images });
  const axes = h("section", { class: "bw-next", "aria-label": words.next_axes });
  const ranking = h("div", {}, cards, others, more);
  const ahead = h("div", {}, tests, images, axes);
  const comparison = makeComparison(words);
  body.append(h("p", { class: "bw-lead bw-soft" }, words.lead), unfound, remarks, strip, ranking, ahead, comparison.node, empty);
  const uncharted = number();
  foot.append(h("p", {}, uncharted, " ", words.uncharted), h("p", {}, words.anatomy_note));
  let all = false;
  let first = true;

  function reveal(key) {
    const card = [...cards.children].find((node) => node.dataset.account === key);
    if (!card) return;
    card.open(true);
    card.scrollIntoView({ block: "nearest", behavior: "smooth" });
  }

  function draw() {
    const told = model.get("told") || {};
    const accounts = told.accounts || [];
    const few = all ? accounts : accounts.filter((a, i) => i < 4 || a.is_plain);
    keep(strip, accounts, (a) => a.key, (a) => {
      const node = share(a, words);
      node.addEventListener("click", () => {
        all = all || !few.includes(a);
        view = "cards";
        views.show(view);
        draw();
        reveal(a.key);
      });
      return node;
    }, (node, a) => node.change(a));
    keep(cards, few, (a) => a.key, (a) => makeCard(a, words, select), (node, a) => node.change(a));
    if (first && accounts.length) {
      cards.firstChild.open(true);
      first = false;
    }
    unfound.hidden = !told.unfound || !accounts.length;
    redo(remarks, told.remarks || [], (lines) => lines.map((line) => h("p", { class: "bw-remark" }, line)));
    remarks.hidden = !remarks.firstChild;
    strip.hidden = accounts.length < 2;
    strip.style.paddingRight = `${Math.min(40, Math.max(0, (told.other_posterior || 0) * 100))}%`;
    redo(others, [told.other_posterior, accounts.length], ([left]) => (left > 0.0005
      ? [number("other_posterior", left, percent(left)), ` ${words.others}`] : []));
    more.hidden = accounts.length <= few.length && !all;
    say(more, all ? words.show_fewer : fill(words.show_all, { count: accounts.length }));
    empty.hidden = accounts.length > 0;
    redo(tests, told.next_tests || [], (rows) => (rows.length ? nextTests(rows, accounts.map((a) => a.kind), words) : [h("p", { class: "bw-soft" }, words.next_none)]));
    redo(images, told.next_images || [], (rows) => (rows.length ? nextImages(rows, words, select) : []));
    redo(axes, told.next_axes || [], (rows) => (rows.length ? nextAxes(rows, words) : []));
    comparison.change(accounts);
    ranking.hidden = view !== "cards" || !accounts.length;
    ahead.hidden = view !== "next" || !accounts.length;
    comparison.node.hidden = view !== "compare" || accounts.length < 2;
    images.hidden = !images.firstChild;
    setNumber(uncharted, "uncharted_share", told.uncharted_share, percent(told.uncharted_share));
    foot.firstChild.hidden = told.uncharted_share === undefined || told.uncharted_share === null;
    say(busy, model.get("busy") ? words.thinking : "");
    mark(panel, "data-stamp", model.get("stamp"));
    mark(panel, "aria-busy", model.get("busy") ? "true" : null);
  }

  return watch(model, ["told", "busy", "stamp"], draw);
}

export default { render };
