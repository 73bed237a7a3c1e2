// What if: choices on the left, what would change on the right, before and after on one line.
import { fill, frame, freshId, glyph, h, keep, mark, number, percent, s, say, segmented, setNumber, watch } from "../front/kit.js";
import { grade, redo, signName } from "./parts.js";

function slider(label, low, high, step, show, change) {
  const id = freshId("slider");
  const shown = h("output", { class: "bw-number", for: id });
  const input = h("input", { id, type: "range", min: low, max: high, step, oninput: () => say(shown, show(Number(input.value))), onchange: () => change(Number(input.value)) });
  const node = h("div", { class: "bw-slider" }, h("label", { for: id }, label), input, shown);
  node.show = (value) => {
    input.value = String(value);
    say(shown, show(value));
  };
  node.input = input;
  return node;
}

function arrow(path, words) {
  const link = s("line", { class: "bw-what-link", y1: "11", y2: "11" });
  const before = s("circle", { class: "bw-what-before", cy: "11", r: "5" });
  const after = s("circle", { class: "bw-what-after", cy: "11", r: "5.5" });
  const node = s("svg", { class: "bw-prof-track", height: "22", role: "img" }, [0, 50, 100].map((x) => s("line", { class: "bw-prof-grid", x1: `${x}%`, x2: `${x}%`, y1: "0", y2: "22" })), link, before, after);
  node.change = (row) => {
    mark(link, "x1", `${row.before * 100}%`);
    mark(link, "x2", `${row.after * 100}%`);
    mark(before, "cx", `${row.before * 100}%`);
    mark(after, "cx", `${row.after * 100}%`);
    mark(node, "aria-label", fill(words.row_label, { before: percent(row.before), after: percent(row.after) }));
  };
  return node;
}

function makeRow(kind, row, words) {
  const line = arrow(kind, words), before = number(), after = number();
  const node = h("li", { class: "bw-what-row" }, h("span", {}, signName(row, words), row.found ? [" ", grade(row.found, words)] : null), line,
    h("span", { class: "bw-prof-numbers" }, before, " → ", after));
  node.change = (now) => {
    line.change(now);
    setNumber(before, `what_if/${kind}/${now.id}/before`, now.before, percent(now.before));
    setNumber(after, `what_if/${kind}/${now.id}/after`, now.after, percent(now.after));
  };
  return node;
}

function render({ model, el }) {
  const words = model.get("words");
  const reset = h("button", { type: "button", class: "bw-button", onclick: () => put({ growth_mm: 0, oedema_share: 1, stage: "", restored: [], severed: [] }) }, words.reset);
  const busy = h("span", { class: "bw-soft", role: "status" });
  const { panel, body, foot } = frame(el, words, "whatif", busy, reset);
  const growth = slider(words.growth, -10, 10, 1, (mm) => (mm === 0 ? words.as_drawn : fill(mm > 0 ? words.larger : words.smaller, { mm: Math.abs(mm) })), (mm) => put({ growth_mm: mm }));
  const oedema = slider(words.oedema, 0, 100, 10, (share) => `${share} %`, (share) => put({ oedema_share: share / 100 }));
  const stages = segmented(words.stage, [["", words.stage_now], ["acute", words.stage_acute], ["subacute", words.stage_subacute], ["chronic", words.stage_chronic]], "", (stage) => put({ stage }));
  const listId = freshId("elements");
  const search = h("input", { class: "bw-search", type: "search", list: listId, placeholder: words.find, "aria-label": words.find });
  const list = h("datalist", { id: listId });
  const add = (where) => () => {
    const wanted = search.value.trim().toLowerCase();
    const found = model.get("offered").find((item) => label(item).toLowerCase() === wanted || item.id === wanted);
    if (!found) return;
    const now = settings();
    put({ restored: now.restored.filter((id) => id !== found.id), severed: now.severed.filter((id) => id !== found.id), [where]: [...now[where].filter((id) => id !== found.id), found.id] });
    search.value = "";
  };
  const chips = h("div", { class: "bw-what-chips" });
  const controls = h("div", { class: "bw-what-controls" }, h("h3", {}, words.lesion), growth, oedema, h("h3", {}, words.time), stages, h("h3", {}, words.elements),
    h("div", { class: "bw-what-add" }, search, list, h("button", { type: "button", class: "bw-button", onclick: add("restored") }, words.make_whole), h("button", { type: "button", class: "bw-button", onclick: add("severed") }, words.cut)), chips);
  const signs = h("ul", { class: "bw-what-list" });
  const functions = h("ul", { class: "bw-what-list" });
  const outcome = h("div", {}, h("p", { class: "bw-prof-key bw-soft" }, s("svg", { width: "14", height: "14", "aria-hidden": "true" }, s("circle", { class: "bw-what-before", cx: "7", cy: "7", r: "5" })), ` ${words.before}`,
    s("svg", { width: "14", height: "14", "aria-hidden": "true" }, s("circle", { class: "bw-what-after", cx: "7", cy: "7", r: "5.5" })), ` ${words.after}`), h("h3", {}, words.signs_change), signs, h("h3", {}, words.functions_change), functions);
  const empty = h("p", { class: "bw-empty" });
  body.append(h("div", { class: "bw-what-split" }, controls, h("div", {}, outcome, empty)));
  foot.append(h("p", {}, words.careful));

  const settings = () => ({ growth_mm: 0, oedema_share: 1, stage: "", restored: [], severed: [], ...model.get("settings") });
  const label = (item) => `${item.name}, ${words[item.side]}`;

  function put(change) {
    model.set("settings", { ...settings(), ...change });
    model.save_changes();
    say(busy, words.thinking);
    draw();
  }

  function draw() {
    const now = settings();
    growth.show(now.growth_mm);
    oedema.show(Math.round(now.oedema_share * 100));
    growth.input.disabled = oedema.input.disabled = !model.get("can_draw");
    stages.show(now.stage);
    const offered = model.get("offered");
    redo(list, offered.map((item) => item.id), () => offered.map((item) => h("option", { value: label(item) })));
    const named = new Map(offered.map((item) => [item.id, item]));
    redo(chips, [now.restored, now.severed], () => ["restored", "severed"].flatMap((where) => now[where].filter((id) => named.has(id)).map((id) =>
      h("button", { type: "button", class: "bw-chip", title: words.take_away, onclick: () => put({ [where]: settings()[where].filter((each) => each !== id) }) }, glyph(named.get(id).kind),
        `${label(named.get(id))}: ${words[where]}`, h("span", { "aria-hidden": "true" }, "×")))));
    const told = model.get("told");
    const any = Boolean(told.signs);
    outcome.hidden = !any;
    keep(signs, told.signs || [], (row) => row.id, (row) => makeRow("signs", row, words), (node, row) => node.change(row));
    keep(functions, told.functions || [], (row) => row.id, (row) => makeRow("functions", row, words), (node, row) => node.change(row));
    empty.hidden = any && told.signs.length + told.functions.length > 0;
    say(empty, any ? words.nothing_changes : words.nothing_yet);
    if (!model.get("busy")) say(busy, "");
    mark(panel, "data-stamp", model.get("stamp"));
  }

  return watch(model, ["settings", "offered", "can_draw", "told", "busy", "stamp"], draw);
}

export default { render };
