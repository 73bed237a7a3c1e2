// Template | own | difference: one row an element that rests on own anatomy.
import { fill, fixed, frame, glyph, h, keep, mark, number, percent, say, selector, setNumber, watch } from "../front/kit.js";

function bar(kind) {
  const node = h("span", { class: `bw-both-bar bw-both-${kind}`, "aria-hidden": "true" }, h("i", {}));
  node.change = (share) => {
    node.firstChild.style.width = `${Math.max(0, Math.min(1, share)) * 100}%`;
  };
  return node;
}

/** A bar from the middle: to the right where the own anatomy loses more. */
function leaning() {
  const node = h("span", { class: "bw-both-bar bw-both-lean", "aria-hidden": "true" }, h("i", {}));
  node.change = (value) => {
    const width = Math.min(1, Math.abs(value)) * 50;
    node.firstChild.style.width = `${width}%`;
    node.firstChild.style.left = `${value < 0 ? 50 - width : 50}%`;
  };
  return node;
}

function signed(value) {
  const points = Math.round(value * 100);
  return `${points > 0 ? "+" : points < 0 ? "\u2212" : ""}${Math.abs(points)} %`;
}

function makeRow(row, words, select) {
  const usual = bar("template"), own = bar("own"), lean = leaning();
  const n = Object.fromEntries(["share", "own_share", "difference", "template_size", "own_size", "apart_mm", "clearance_mm", "own_clearance_mm"].map((key) => [key, number()]));
  const unit = row.kind === "segment" ? "mm" : "ml";
  const node = h("tr", { "data-element": row.element },
    h("th", { scope: "row" }, h("button", { type: "button", class: "bw-both-name", onclick: () => select(row.element) }, glyph(row.kind), h("span", {}, row.name),
      h("span", { class: "bw-side", title: words[row.side] }, words[`${row.side}_short`])), h("span", { class: "bw-soft" }, row.own_anatomy)),
    h("td", {}, usual, n.share), h("td", {}, own, n.own_share), h("td", {}, lean, n.difference),
    h("td", {}, n.clearance_mm, " / ", n.own_clearance_mm, " mm"), h("td", {}, n.template_size, " / ", n.own_size, ` ${unit}`), h("td", {}, n.apart_mm, " mm"));
  node.change = (r, selected) => {
    const path = `anatomies/${r.element}`;
    usual.change(r.share);
    own.change(r.own_share);
    lean.change(r.difference);
    setNumber(n.share, `${path}/share`, r.share, percent(r.share));
    setNumber(n.own_share, `${path}/own_share`, r.own_share, percent(r.own_share));
    setNumber(n.difference, `${path}/difference`, r.difference, signed(r.difference));
    for (const key of ["template_size", "own_size", "apart_mm", "clearance_mm", "own_clearance_mm"]) setNumber(n[key], `${path}/${key}`, r[key], fixed(r[key], 1));
    mark(node, "aria-current", selected === r.element ? "true" : null);
  };
  return node;
}

function render({ model, el }) {
  const words = model.get("words");
  const select = selector(model);
  const { panel, body, foot } = frame(el, words, "anatomies");
  const column = (text, hint) => h("th", { scope: "col", title: hint }, text);
  const rows = h("tbody", {});
  const table = h("table", { class: "bw-both", "aria-label": words.title },
    h("thead", {}, h("tr", {}, column(words.element), column(words.by_template), column(words.by_own), column(words.difference, words.difference_hint),
      column(words.clearance, words.clearance_hint), column(words.size, words.size_hint), column(words.apart, words.apart_hint))), rows);
  const whose = h("p", { class: "bw-both-whose" });
  const none = h("p", { class: "bw-empty" }, words.none);
  const list = h("ul", {});
  const notes = h("details", { class: "bw-both-notes" }, h("summary", {}, words.notes), list);
  body.append(whose, table, none, notes);
  foot.append(h("p", {}, words.how));

  function draw() {
    const told = model.get("rows"), selected = model.get("selected");
    say(whose, model.get("whose") ? fill(words.whose, { whose: model.get("whose") }) : "");
    keep(rows, told, (row) => row.element, (row) => makeRow(row, words, select), (node, row) => node.change(row, selected));
    table.hidden = told.length === 0;
    none.hidden = told.length > 0;
    foot.hidden = told.length === 0;
    list.replaceChildren(...model.get("notes").map((note) => h("li", {}, note)));
    notes.hidden = model.get("notes").length === 0;
    mark(panel, "data-stamp", model.get("stamp"));
  }

  return watch(model, ["rows", "whose", "notes", "selected", "stamp"], draw);
}

export default { render };
