// Regions that lost their input: the share lost, why the region is named, and the network's standard measures.
import { fixed, frame, glyph, h, keep, mark, number, percent, say, selector, setNumber, watch } from "../front/kit.js";

const MEASURES = [["strength_before", 1], ["strength_after", 1], ["path_before", 3], ["path_after", 3]];

function makeRow(row, words, select) {
  const n = Object.fromEntries(["lost_input", "own_damage", "communicability_kept", ...MEASURES.map(([name]) => name)].map((name) => [name, number()]));
  const bar = h("span", { class: "bw-remote-bar", "aria-hidden": "true" }, h("i", {}));
  const why = h("p", { class: "bw-soft" }), tag = h("span", { class: "bw-remote-tag" });
  const cut = h("span", {}, words.cut_off);
  const node = h("tr", { "data-element": row.element },
    h("th", { scope: "row" }, h("button", { type: "button", class: "bw-remote-name", onclick: () => select(row.element) }, glyph("region"), h("span", {}, row.name)), " ", tag, why),
    h("td", {}, bar, n.lost_input), h("td", {}, n.own_damage), h("td", {}, n.strength_before, " → ", n.strength_after),
    h("td", {}, n.communicability_kept), h("td", {}, n.path_before, " → ", n.path_after, cut));
  node.change = (r, selected) => {
    const path = `remote/${r.element}`;
    for (const name of ["lost_input", "own_damage", "communicability_kept"]) setNumber(n[name], `${path}/${name}`, r[name], percent(r[name]));
    for (const [name, decimals] of MEASURES) setNumber(n[name], `${path}/${name}`, r[name], fixed(r[name], decimals));
    cut.hidden = r.path_after !== null; // no finite mean: some region is out of reach
    n.path_after.hidden = !cut.hidden;
    bar.firstChild.style.width = `${r.lost_input * 100}%`;
    say(why, r.words);
    say(tag, r.named ? words.named : "");
    tag.hidden = !r.named;
    mark(node, "aria-current", selected === r.element ? "true" : null);
  };
  return node;
}

function render({ model, el }) {
  const words = model.get("words");
  const select = selector(model);
  const { panel, body, foot } = frame(el, words, "remote");
  const column = (text, hint) => h("th", { scope: "col", title: hint }, text);
  const rows = h("tbody", {});
  const table = h("table", { class: "bw-remote", "aria-label": words.title }, h("thead", {}, h("tr", {}, column(words.region), column(words.lost_input, words.lost_input_hint),
    column(words.own_damage), column(words.strength, words.strength_hint), column(words.communicability, words.communicability_hint), column(words.path, words.path_hint))), rows);
  const empty = h("p", { class: "bw-empty" }, words.nothing);
  body.append(table, empty);
  foot.append(h("p", {}, words.how), h("p", {}, words.charted));

  function draw() {
    const told = model.get("rows"), selected = model.get("selected");
    keep(rows, told, (row) => row.element, (row) => makeRow(row, words, select), (node, row) => node.change(row, selected));
    table.hidden = told.length === 0;
    empty.hidden = told.length > 0;
    mark(panel, "data-stamp", model.get("stamp"));
  }

  return watch(model, ["rows", "selected", "stamp"], draw);
}

export default { render };
