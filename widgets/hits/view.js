// What is hit: a sorted table whose rows are changed in place, so that a stroke redraws only what it changed.
import { fill, fixed, frame, glyph, h, keep, mark, number, percent, say, segmented, selector, setNumber, watch } from "../front/kit.js";
import { asText, readRows, split } from "./rows.js";

function bar(row, words) {
  const node = h("span", { class: "bw-bar", role: "img" },
    h("i", { class: "bw-bar-fill" }), h("i", { class: "bw-bar-reach" }));
  node.change = (r) => {
    const shown = Number.isFinite(r.low);
    mark(node, "aria-label", fill(shown ? words.bar_label_range : words.bar_label,
      { share: percent(r.share), low: percent(r.low), high: percent(r.high) }));
    node.children[0].style.width = `${Math.max(0, Math.min(1, r.share)) * 100}%`;
    node.children[1].hidden = !shown || r.high <= 0.004;
    node.children[1].style.left = `${r.low * 100}%`;
    node.children[1].style.width = `${Math.max(0, r.high - r.low) * 100}%`;
  };
  return node;
}

function makeRow(row, words, select) {
  const share = bar(row, words);
  const cells = {
    share: number(), range: h("td", { role: "cell", class: "bw-hits-range bw-soft" }), overlap: number(), clearance: number(),
    where: h("span", { class: "bw-soft" }),
  };
  const low = number(), high = number(), waiting = h("span", { class: "bw-waiting", title: words.interval_waits }, "…");
  const range = h("span", {}, low, " – ", high);
  cells.range.append(range, waiting);
  const name = h("button", { type: "button", class: "bw-hits-name", onclick: () => select(row.element) },
    glyph(row.kind), h("span", { class: "bw-hits-label" }, row.name),
    h("span", { class: "bw-side", title: words[row.side] }, words[`${row.side}_short`]),
    row.anatomy === "template" ? null : h("span", { class: "bw-hits-own", title: words.own_hint }, row.anatomy));
  const anatomy = row.anatomy === "template" ? words.template_short : row.anatomy;
  const node = h("tr", { role: "row", class: `bw-hits-row bw-is-${row.kind}`, "data-element": row.element },
    h("th", { scope: "row", role: "rowheader" }, name),
    h("td", { role: "cell", class: "bw-hits-bar" }, share),
    h("td", { role: "cell", class: "bw-hits-share" }, cells.share),
    cells.range,
    h("td", { role: "cell", class: "bw-hits-clearance" }, cells.clearance, " ", cells.where),
    h("td", { role: "cell", class: "bw-hits-overlap" }, cells.overlap),
    h("td", { role: "cell", class: "bw-hits-anatomy bw-soft", title: anatomy }, anatomy));
  node.change = (r, selected) => {
    const path = `damage/${r.element}`;
    share.change(r);
    setNumber(cells.share, `${path}/share`, r.share, percent(r.share));
    const known = Number.isFinite(r.low);
    range.hidden = !known;
    waiting.hidden = known;
    setNumber(low, `${path}/low`, r.low, percent(r.low).replace(" %", ""));
    setNumber(high, `${path}/high`, r.high, percent(r.high));
    setNumber(cells.overlap, `${path}/overlap_ml`, r.overlap_ml, fixed(r.overlap_ml, 1));
    const depth = Math.abs(r.clearance_mm);
    setNumber(cells.clearance, `${path}/clearance_mm`, r.clearance_mm, `${fixed(depth, depth < 10 ? 1 : 0)} mm`);
    say(cells.where, Number.isFinite(r.clearance_mm) ? (r.clearance_mm < 0 ? words.inside : words.away) : "");
    mark(node, "aria-current", selected === r.element ? "true" : null);
  };
  return node;
}

function render({ model, el }) {
  const words = model.get("words");
  const view = { kind: "all", text: "" };
  const select = selector(model);
  const kinds = segmented(words.filter_label,
    [["all", words.all], ["segment", words.segments], ["region", words.regions]], "all", (kind) => {
      view.kind = kind;
      draw();
    });
  const search = h("input", { class: "bw-search", type: "search", placeholder: words.search, "aria-label": words.search,
    oninput: () => { view.text = search.value; draw(); } });
  const copied = h("span", { class: "bw-soft", role: "status" });
  const copy = h("button", { type: "button", class: "bw-button", title: words.copy_hint, onclick: copyTable }, words.copy);
  const { panel, body, foot } = frame(el, words, "hits", kinds, search, copy, copied);

  const head = h("thead", { role: "rowgroup" }, h("tr", { role: "row" },
    h("th", { scope: "col", role: "columnheader" }, words.element),
    h("th", { scope: "col", role: "columnheader", class: "bw-hits-wide", title: words.share_hint }, words.share),
    h("th", { scope: "col", role: "columnheader", class: "bw-hits-range", title: words.range_hint }, words.range),
    h("th", { scope: "col", role: "columnheader", class: "bw-hits-clearance", title: words.clearance_hint }, words.clearance),
    h("th", { scope: "col", role: "columnheader", class: "bw-hits-overlap", title: words.overlap_hint }, words.overlap),
    h("th", { scope: "col", role: "columnheader", class: "bw-hits-anatomy" }, words.anatomy)));
  const hit = h("tbody", { role: "rowgroup" });
  const nearHead = h("tbody", { role: "rowgroup", class: "bw-hits-near" },
    h("tr", { role: "row" }, h("th", { scope: "rowgroup", role: "rowheader" }, words.near)));
  const near = h("tbody", { role: "rowgroup", class: "bw-hits-pale" });
  const empty = h("p", { class: "bw-empty" });
  const table = h("table", { class: "bw-hits-table", "aria-label": words.title, role: "table" }, head, hit, nearHead, near);
  body.append(h("div", { class: "bw-hits-scroll" }, table, empty));
  const uncharted = number();
  foot.append(h("p", { class: "bw-hits-uncharted" }, uncharted, " ", words.uncharted),
    h("p", {}, words.anatomy_note));
  let shown = { hit: [], near: [] };
  let known = false; // once it was known, the line about uncharted matter keeps its place

  function draw() {
    const rows = readRows(model.get("elements"), model.get("values"));
    shown = split(rows, view, words);
    const selected = model.get("selected");
    const make = (row) => makeRow(row, words, select);
    const change = (node, row) => node.change(row, selected);
    keep(hit, shown.hit, (row) => row.element, make, change);
    keep(near, shown.near, (row) => row.element, make, change);
    nearHead.hidden = shown.near.length === 0;
    table.hidden = shown.hit.length + shown.near.length === 0;
    empty.hidden = !table.hidden;
    say(empty, view.text ? fill(words.nothing_found, { text: view.text }) : words.nothing_hit);
    const share = model.get("uncharted_share");
    if (Number.isFinite(share)) known = true;
    foot.firstChild.hidden = !known;
    setNumber(uncharted, "uncharted_share", share, percent(share));
    mark(table, "data-old-clearance", model.get("clearance_waits"));
    mark(panel, "data-stamp", model.get("stamp"));
  }

  async function copyTable() {
    const text = asText([...shown.hit, ...shown.near], words);
    try {
      await navigator.clipboard.writeText(text);
      say(copied, words.copied);
    } catch {
      const area = h("textarea", { class: "bw-hidden-text" });
      area.value = text;
      panel.append(area);
      area.select();
      say(copied, document.execCommand("copy") ? words.copied : words.copy_failed);
      area.remove();
    }
    setTimeout(() => say(copied, ""), 2500);
  }

  return watch(model, ["elements", "values", "clearance_waits", "stamp", "selected", "uncharted_share"], draw);
}

export default { render };
