// The neighbourhood of one place in the graph, on four shelves: regions, segments, functions, signs.
import { h, keep, mark, s, say } from "../front/kit.js";

const SHELVES = ["region", "segment", "function", "sign"];

/** The nodes within one step of a node (two through a function), and the edges among them that pass a filter. */
export function neighbourhood(graph, centre, passes) {
  const near = new Set([centre]);
  const edges = [];
  for (const edge of graph.edgesOf.get(centre) || []) {
    if (!passes(edge)) continue;
    near.add(edge.a === centre ? edge.b : edge.a);
  }
  const kind = graph.nodes.get(centre).kind;
  // A sign is seen down to the elements behind its functions; an element up to the signs of what it serves.
  const beyond = { sign: "serves", region: "shows_as", segment: "shows_as" }[kind];
  for (const one of beyond ? [...near] : []) {
    if (graph.nodes.get(one).kind !== "function") continue;
    for (const edge of graph.edgesOf.get(one) || []) {
      if (edge.relation === beyond && passes(edge)) near.add(edge.a === one ? edge.b : edge.a);
    }
  }
  const seen = new Set();
  for (const one of near) {
    for (const edge of graph.edgesOf.get(one) || []) {
      if (seen.has(edge.id) || !near.has(edge.a) || !near.has(edge.b) || !passes(edge)) continue;
      seen.add(edge.id);
      edges.push(edge);
    }
  }
  return { near, edges };
}

/** Draws the shelves once and changes them in place; an item keeps its place as long as it is shown. */
export function makeShelves(words, pick, point) {
  const lines = s("svg", { class: "bw-shelf-lines", "aria-hidden": "true" });
  const columns = SHELVES.map((kind) => {
    const list = h("ul", { class: "bw-shelf-list", "aria-label": words[`${kind}s`] });
    return { kind, list, node: h("div", { class: `bw-shelf bw-shelf-${kind}` }, h("h3", {}, words[`${kind}s`]), list) };
  });
  const board = h("div", { class: "bw-shelves" }, lines, columns.map((column) => column.node));
  let shown = { edges: [] };

  function item(node) {
    const button = h("button", { type: "button", class: "bw-shelf-item", "data-key": node.key,
      onclick: () => pick(node.key), onfocus: () => light(node.key), onmouseenter: () => light(node.key), onmouseleave: () => light(null), onblur: () => light(null) }, node.name);
    return h("li", {}, button);
  }

  function light(key) {
    for (const [i, edge] of shown.edges.entries()) {
      const on = key && (edge.a === key || edge.b === key);
      lines.children[i]?.classList.toggle("bw-lit", Boolean(on));
    }
    if (key) point(key);
  }

  function wires() {
    const frame = board.getBoundingClientRect();
    if (!frame.width) return;
    const at = new Map();
    for (const button of board.querySelectorAll(".bw-shelf-item")) {
      const box = button.getBoundingClientRect();
      at.set(button.dataset.key, { left: box.left - frame.left, right: box.right - frame.left, y: box.top + box.height / 2 - frame.top });
    }
    mark(lines, "width", frame.width);
    mark(lines, "height", board.scrollHeight);
    lines.replaceChildren(...shown.edges.map((edge) => {
      let [a, b] = [at.get(edge.a), at.get(edge.b)];
      if (!a || !b) return s("path", {});
      if (a.left > b.left) [a, b] = [b, a];
      const bend = Math.max(24, (b.left - a.right) / 2);
      const path = s("path", { class: `bw-wire bw-wire-${edge.relation} bw-grade-${edge.grade} ${edge.disputed ? "bw-disputed" : ""}`,
        d: `M${a.right} ${a.y}C${a.right + bend} ${a.y} ${b.left - bend} ${b.y} ${b.left} ${b.y}` });
      return path;
    }));
  }

  board.addEventListener("keydown", (event) => {
    const here = event.target.closest?.(".bw-shelf-item");
    if (!here) return;
    const column = columns.findIndex((each) => each.list.contains(here));
    const list = [...columns[column].list.querySelectorAll(".bw-shelf-item")];
    const row = list.indexOf(here);
    let next = null;
    if (event.key === "ArrowDown") next = list[row + 1];
    else if (event.key === "ArrowUp") next = list[row - 1];
    else if (event.key === "ArrowRight" || event.key === "ArrowLeft") {
      for (let c = column + (event.key === "ArrowRight" ? 1 : -1); c >= 0 && c < columns.length && !next; c += event.key === "ArrowRight" ? 1 : -1) {
        const there = [...columns[c].list.querySelectorAll(".bw-shelf-item")];
        next = there[Math.min(row, there.length - 1)];
      }
    }
    if (next) {
      event.preventDefault();
      next.focus();
    }
  });

  function change(graph, centre, { near, edges }) {
    shown = { edges };
    for (const column of columns) {
      const nodes = [...graph.nodes.values()].filter((node) => node.kind === column.kind && near.has(node.key));
      keep(column.list, nodes, (node) => node.key, item, (li, node) => {
        mark(li.firstChild, "aria-current", node.key === centre ? "true" : null);
        say(li.firstChild, node.name);
      });
      column.node.classList.toggle("bw-shelf-empty", nodes.length === 0);
    }
    wires();
  }

  return { board, change, wires };
}
