// The graph in the hand: any region, segment, function or sign with all that touches it, and the whole at one glance.
import { fill, frame, freshId, glyph, h, mark, say, segmented, watch } from "../front/kit.js";
import { makeShelves, neighbourhood } from "./shelves.js";
import { makeWheel } from "./wheel.js";

const STRENGTH = { weak: 1, moderate: 2, strong: 3 };

/** Look-ups over what the kernel sent. */
export function unpack(told) {
  const nodes = new Map(told.nodes.map((node) => [node.key, node]));
  const edgesOf = new Map();
  const edges = told.edges.map(([a, b, relation, claims], id) => {
    const spoken = claims.map((i) => told.claims[i]);
    const best = Math.max(0, ...spoken.filter((claim) => claim.stance === "supports").map((claim) => STRENGTH[claim.grade]));
    const edge = { id, a, b, relation, claims: spoken, disputed: spoken.some((claim) => claim.stance === "disputes"),
      grade: ["none", "weak", "moderate", "strong"][best] };
    for (const end of [a, b]) edgesOf.set(end, [...(edgesOf.get(end) || []), edge]);
    return edge;
  });
  return { nodes, edges, edgesOf, domains: told.domains, sources: told.sources, layers: told.layers };
}

function filterBox(name, values, words, change) {
  const id = freshId(name);
  const select = h("select", { id, onchange: () => change(name, select.value) }, h("option", { value: "" }, words[`any_${name}`]),
    values.map((value) => h("option", { value }, words[`${name}_${value}`] || value)));
  return h("span", { class: "bw-filter" }, h("label", { for: id, class: "bw-hidden-text" }, words[`any_${name}`]), select);
}

function claimItem(claim, graph, words) {
  return h("li", { class: `bw-graph-claim bw-stance-${claim.stance}` }, h("p", {}, claim.says),
    h("p", {}, [`grade_${claim.grade}`, `kind_${claim.kind}`, `population_${claim.population}`, `stance_${claim.stance}`].map((key) => [h("span", { class: "bw-tag" }, words[key]), " "]),
      claim.layer ? h("span", { class: "bw-tag" }, claim.layer) : null),
    claim.sources.map((key) => h("p", { class: "bw-soft" }, `${graph.sources[key]?.text || key} `, h("span", { class: "bw-tag" }, words[`checked_${graph.sources[key]?.checked || "memory"}`]))),
    claim.note ? h("p", { class: "bw-soft" }, claim.note) : null);
}

function about(key, graph, words, passes) {
  const node = graph.nodes.get(key);
  if (!node) return [];
  const edges = (graph.edgesOf.get(key) || []).filter(passes);
  const claims = [...new Map(edges.flatMap((edge) => edge.claims).map((claim) => [claim.key, claim])).values()];
  return [h("h3", {}, node.kind === "region" || node.kind === "segment" ? glyph(node.kind) : null, " ", node.name),
    h("p", { class: "bw-soft" }, [words[node.kind], node.layer ? `${words.layer} ${node.layer}` : null].filter(Boolean).join(" · ")),
    node.text ? h("p", {}, node.text) : null, node.caution ? h("p", { class: "bw-graph-caution" }, node.caution) : null,
    h("p", { class: "bw-soft" }, fill(words.claim_count, { count: claims.length })),
    h("ul", { class: "bw-graph-claims" }, claims.map((claim) => claimItem(claim, graph, words)))];
}

function render({ model, el }) {
  const words = model.get("words");
  const filters = {};
  const listId = freshId("places");
  const search = h("input", { class: "bw-search bw-graph-search", type: "search", list: listId, placeholder: words.search, "aria-label": words.search,
    onchange: () => go(search.value) });
  const list = h("datalist", { id: listId });
  const mode = segmented(words.mode, [["shelves", words.mode_shelves], ["wheel", words.mode_wheel]], "shelves", (which) => { shown = which; draw(); });
  const back = h("button", { type: "button", class: "bw-button", onclick: () => { const last = trail.pop(); if (last) visit(last, false); } }, words.back);
  const { panel, body, foot } = frame(el, words, "graph", mode, search, list, back);
  const boxes = h("div", { class: "bw-filters", role: "group", "aria-label": words.filters });
  const shelves = makeShelves(words, (key) => visit(key), (key) => describe(key));
  const wheel = makeWheel(words, (key) => { mode.show("shelves"); shown = "shelves"; visit(key); }, (key) => describe(key));
  const facts = h("aside", { class: "bw-graph-facts" });
  const stage = h("div", { class: "bw-graph-stage" }, shelves.board, wheel.board);
  const empty = h("p", { class: "bw-empty" }, words.nothing);
  body.append(boxes, h("p", { class: "bw-soft bw-graph-key" }, words.key), h("div", { class: "bw-graph-split" }, stage, facts), empty);
  let graph = null;
  let told = null;
  let shown = "shelves";
  const trail = [];

  const passes = (edge) => {
    const active = Object.entries(filters).filter(([, value]) => value);
    if (!active.length) return true;
    return edge.claims.some((claim) => active.every(([name, value]) => claim[name] === value));
  };

  function go(text) {
    const wanted = text.trim().toLowerCase();
    if (!graph || !wanted) return;
    const all = [...graph.nodes.values()];
    const hit = all.find((node) => node.name.toLowerCase() === wanted || node.key === wanted) || all.find((node) => node.name.toLowerCase().includes(wanted));
    if (hit) visit(hit.key);
  }

  function visit(key, remember = true) {
    if (remember && model.get("centre") && model.get("centre") !== key) trail.push(model.get("centre"));
    model.set("centre", key);
    model.save_changes();
    draw();
    [...shelves.board.querySelectorAll(".bw-shelf-item")].find((item) => item.dataset.key === key)?.focus({ preventScroll: true });
  }

  function describe(key) {
    facts.replaceChildren(...about(key, graph, words, passes).filter(Boolean));
  }

  function draw() {
    const now = model.get("told");
    if (now !== told) {
      told = now;
      graph = now && now.nodes ? unpack(now) : null;
      if (graph) {
        list.replaceChildren(...[...graph.nodes.values()].map((node) => h("option", { value: node.name })));
        boxes.replaceChildren(...["grade", "kind", "stance", "population", "layer"].map((name) => filterBox(name,
          [...new Set(now.claims.map((claim) => claim[name]))].filter(Boolean).sort(), words, (which, value) => { filters[which] = value; draw(); })));
      }
    }
    const none = !graph;
    for (const node of [boxes, stage, facts]) node.hidden = none;
    empty.hidden = !none;
    if (none) return;
    const centre = graph.nodes.has(model.get("centre")) ? model.get("centre") : graph.nodes.keys().next().value;
    shelves.board.hidden = shown !== "shelves";
    wheel.board.hidden = shown !== "wheel";
    back.disabled = trail.length === 0;
    const start = performance.now();
    if (shown === "shelves") shelves.change(graph, centre, neighbourhood(graph, centre, passes));
    else wheel.change(graph, centre, passes);
    mark(panel, "data-redraw-ms", Math.round(performance.now() - start));
    describe(centre);
    mark(panel, "data-stamp", model.get("stamp"));
  }

  const sized = new ResizeObserver(() => (shown === "shelves" ? shelves.wires() : wheel.paint()));
  sized.observe(stage);
  const stop = watch(model, ["told", "centre", "stamp"], draw);
  return () => {
    sized.disconnect();
    stop();
  };
}

export default { render };
