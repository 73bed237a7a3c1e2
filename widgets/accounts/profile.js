// Expected against found, sign by sign under its functions, the plain cortical reading beside the full model.
import { fill, frame, h, keep, mark, number, percent, s, say, segmented, setNumber, watch } from "../front/kit.js";
import { grade, signName } from "./parts.js";

const LIKELY = 0.3; // a sign that nobody looked for is worth showing from here on

function track(words) {
  const band = s("rect", { class: "bw-prof-band", y: "7", height: "10", rx: "5" });
  const link = s("line", { class: "bw-prof-link", y1: "12", y2: "12" });
  const plain = s("g", { class: "bw-prof-plain" }, s("svg", { y: "6", width: "12", height: "12", overflow: "visible" },
    s("path", { d: "M0 -6 6 0 0 6 -6 0Z", transform: "translate(0 6)" })));
  const full = s("circle", { class: "bw-prof-full", cy: "12", r: "6" });
  const node = s("svg", { class: "bw-prof-track", role: "img", height: "24" },
    [0, 50, 100].map((x) => s("line", { class: "bw-prof-grid", x1: `${x}%`, x2: `${x}%`, y1: "0", y2: "24" })), band, link, plain, full);
  node.change = (row) => {
    const at = (x) => `${(x * 100).toFixed(1)}%`;
    mark(band, "x", at(row.low));
    mark(band, "width", at(Math.max(0, row.high - row.low)));
    mark(link, "x1", at(row.expected_cortical));
    mark(link, "x2", at(row.expected));
    mark(plain.firstChild, "x", at(row.expected_cortical));
    mark(full, "cx", at(row.expected));
    mark(node, "aria-label", fill(words.row_label, { full: percent(row.expected), plain: percent(row.expected_cortical) }));
  };
  return node;
}

function verdict(row, words) {
  if (!row.found) return "";
  const present = row.found !== "absent";
  const hits = (p) => (p >= 0.5) === present;
  if (hits(row.expected) && !hits(row.expected_cortical)) return words.full_only;
  if (!hits(row.expected) && hits(row.expected_cortical)) return words.plain_only;
  return hits(row.expected) ? words.both_fit : words.neither_fits;
}

function makeRow(row, words) {
  const line = track(words), full = number(), plain = number(), found = h("span", { class: "bw-prof-found" }), fits = h("span", { class: "bw-prof-verdict" });
  const node = h("li", { class: "bw-prof-row", "data-sign": row.id },
    h("span", { class: "bw-prof-name" }, signName(row, words)), found, line,
    h("span", { class: "bw-prof-numbers" }, full, " ", h("span", { class: "bw-soft" }, plain)), fits);
  node.change = (r) => {
    line.change(r);
    setNumber(full, `signs/${r.id}/expected`, r.expected, percent(r.expected));
    setNumber(plain, `signs/${r.id}/expected_cortical`, r.expected_cortical, percent(r.expected_cortical));
    found.replaceChildren(grade(r.found || "not_tested", words));
    const text = verdict(r, words);
    say(fits, text);
    mark(node, "data-verdict", text === words.full_only ? "full" : text === words.neither_fits ? "none" : null);
  };
  return node;
}

function render({ model, el }) {
  const words = model.get("words");
  const view = { show: "found" };
  const choose = segmented(words.show_label, [["found", words.show_found], ["likely", words.show_likely], ["all", words.show_all]], "found",
    (show) => { view.show = show; draw(); });
  const { panel, body } = frame(el, words, "profile", choose);
  const key = h("p", { class: "bw-prof-key bw-soft" },
    s("svg", { width: "14", height: "14", "aria-hidden": "true" }, s("circle", { class: "bw-prof-full", cx: "7", cy: "7", r: "5.5" })), ` ${words.full}`,
    s("svg", { width: "14", height: "14", "aria-hidden": "true" }, s("g", { class: "bw-prof-plain" }, s("path", { d: "M7 1 13 7 7 13 1 7Z" }))), ` ${words.plain}`,
    s("svg", { width: "26", height: "14", "aria-hidden": "true" }, s("rect", { class: "bw-prof-band", x: "1", y: "2", width: "24", height: "10", rx: "5" })), ` ${words.reach}`);
  const groups = h("div", { class: "bw-prof-groups" });
  const empty = h("p", { class: "bw-empty" }, words.nothing);
  body.append(key, groups, empty);

  function draw() {
    const rows = model.get("rows").filter((row) => view.show === "all" || row.found || (view.show === "likely" && row.expected >= LIKELY));
    const sets = new Map();
    for (const row of rows) {
      if (!sets.has(row.group)) sets.set(row.group, { name: row.group, rows: [] });
      sets.get(row.group).rows.push(row);
    }
    keep(groups, [...sets.values()], (set) => set.name,
      (set) => Object.assign(h("section", { class: "bw-prof-group" }, h("h3", {}, set.name), h("ul", {})), {}),
      (node, set) => keep(node.lastChild, set.rows, (row) => row.id, (row) => makeRow(row, words), (item, row) => item.change(row)));
    empty.hidden = rows.length > 0;
    key.hidden = rows.length === 0;
    mark(panel, "data-stamp", model.get("stamp"));
  }

  return watch(model, ["rows", "stamp"], draw);
}

export default { render };
