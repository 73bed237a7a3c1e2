// The routes of a function: what each element usually carries, what is cut, what still flows, and where it is held back.
import { fill, fixed, frame, freshId, glyph, h, mark, number, percent, s, say, selector, setNumber, watch } from "../front/kit.js";
import { arrange } from "./layout.js";

function hatch(id) {
  return s("pattern", { id, width: "6", height: "6", patternUnits: "userSpaceOnUse", patternTransform: "rotate(45)" },
    s("rect", { width: "6", height: "6", class: "bw-route-gap" }), s("rect", { width: "2.4", height: "6", class: "bw-route-scar" }));
}

function drawNet(net, words, width, selected, select, describe) {
  const place = arrange(net.nodes, net.routes, width);
  const pattern = freshId("hatch");
  const svg = s("svg", { class: "bw-route-map", width, height: place.height, viewBox: `0 0 ${width} ${place.height}`, "aria-hidden": "true" }, s("defs", {}, hatch(pattern)));
  for (const [r, band] of place.bands.entries()) {
    svg.append(s("path", { class: "bw-route-ghost", d: band.ghost }), s("path", { class: `bw-route-live bw-route-tone-${r % 6}`, d: band.live }));
  }
  const labels = net.nodes.map((node, n) => {
    const box = place.nodes[n];
    const lost = node.damage * box.h;
    svg.append(
      s("rect", { class: `bw-route-node bw-${node.kind}`, x: box.x, y: box.y, width: box.w, height: box.h, rx: node.kind === "region" ? 4 : Math.min(9, box.h / 2) }),
      lost > 0.5 ? s("rect", { x: box.x, y: box.y + box.h - lost, width: box.w, height: lost, rx: 3, fill: `url(#${pattern})` }) : null,
      node.held ? s("rect", { class: "bw-route-ring", x: box.x - 5, y: box.y - 5, width: box.w + 10, height: box.h + 10, rx: 12 }) : null);
    const reach = node.kind === "region" ? Math.max(96, width / 7) : box.w;
    const button = h("button", { type: "button", class: "bw-route-label", "data-element": node.id, "aria-pressed": selected === node.id ? "true" : "false",
      style: `left:${box.x}px;top:${box.y}px;max-width:${reach}px`, onclick: () => { select(node.id); describe(n); }, onfocus: () => describe(n), onmouseenter: () => describe(n) },
      h("span", {}, glyph(node.kind), " ", node.side === "midline" ? null : [h("span", { class: "bw-side" }, words[`${node.side}_short`]), " "], node.name),
      node.damage >= 0.005 ? h("span", { class: "bw-soft" }, number(`routes/${net.copy}/elements/${node.id}/damage`, node.damage, percent(node.damage)), ` ${words.lost}`) : null);
    return button;
  });
  for (const child of [...svg.childNodes]) if (child === null) child.remove();
  return h("div", { class: "bw-route-canvas", style: `height:${place.height}px;width:${width}px` }, svg, labels);
}

function drawTable(net, words) {
  return h("table", { class: "bw-route-table" },
    h("thead", {}, h("tr", {}, h("th", { scope: "col" }, words.route), h("th", { scope: "col", class: "bw-right" }, words.usual), h("th", { scope: "col", class: "bw-right" }, words.now), h("th", { scope: "col" }))),
    h("tbody", {}, net.routes.map((route, r) => {
      const path = `routes/${net.copy}/${route.key}`;
      return h("tr", {}, h("th", { scope: "row" }, h("i", { class: `bw-route-swatch bw-route-tone-${r % 6}` }), route.name),
        h("td", { class: "bw-right" }, number(`${path}/usual`, route.usual, percent(route.usual))),
        h("td", { class: "bw-right" }, number(`${path}/now`, route.now, percent(route.now))),
        h("td", { class: "bw-soft" }, route.now > route.usual + 0.005 ? words.carries_more : route.now < 0.005 ? words.carries_nothing : ""));
    })));
}

function drawFacts(node, net, words) {
  if (!node) return [h("p", { class: "bw-soft" }, words.point_at)];
  return [h("h3", {}, node.name), h("p", { class: "bw-soft" }, fill(words.node_line, { load: percent(node.load), damage: percent(node.damage) })),
    node.claims.length ? h("ul", { class: "bw-route-claims" }, node.claims.map((claim) => h("li", { class: `bw-stance-${claim.stance}` },
      h("p", {}, claim.says, " ", h("span", { class: "bw-tag" }, words[`grade_${claim.grade}`]), " ", h("span", { class: "bw-tag" }, words[`kind_${claim.kind}`])),
      h("p", { class: "bw-soft" }, claim.sources.map((source) => `${source.text} (${words[`checked_${source.checked}`]})`).join("; ")))))
      : h("p", { class: "bw-soft" }, words.no_claims)];
}

function render({ model, el }) {
  const words = model.get("words");
  const chooser = h("select", { "aria-label": words.choose, onchange: () => { model.set("chosen", chooser.value); model.save_changes(); } });
  const under = h("select", { "aria-label": words.under, onchange: () => { model.set("account", Number(under.value)); model.save_changes(); } });
  const { panel, body, foot } = frame(el, words, "routes", chooser, under);
  const head = h("p", { class: "bw-route-head" });
  const capacity = number();
  const sentence = h("span", {});
  head.append(h("span", { class: "bw-soft" }, `${words.capacity} `), capacity, h("span", {}, " · "), sentence);
  const stage = h("div", { class: "bw-route-stage" });
  const table = h("div", {});
  const facts = h("aside", { class: "bw-route-facts", "aria-live": "polite" });
  const empty = h("p", { class: "bw-empty" }, words.nothing);
  body.append(head, stage, h("p", { class: "bw-route-key bw-soft" }, words.key), h("div", { class: "bw-route-lower" }, table, facts), empty);
  foot.append(h("p", {}, words.anatomy_note));
  let width = 0;
  let told = null;

  function describe(n) {
    const net = model.get("net");
    facts.replaceChildren(...drawFacts(n === null ? null : net.nodes[n], net, words));
  }

  function draw() {
    const net = model.get("net");
    const choices = model.get("choices");
    const wanted = JSON.stringify(choices);
    if (chooser.$shown !== wanted) {
      chooser.$shown = wanted;
      const groups = new Map();
      for (const choice of choices) groups.set(choice.group, [...(groups.get(choice.group) || []), choice]);
      chooser.replaceChildren(...[...groups].map(([group, list]) => h("optgroup", { label: group },
        list.map((choice) => h("option", { value: choice.id }, `${choice.name} (${percent(choice.capacity)})`)))));
    }
    chooser.value = model.get("chosen");
    const titles = model.get("accounts");
    if (under.$shown !== JSON.stringify(titles)) {
      under.$shown = JSON.stringify(titles);
      under.replaceChildren(h("option", { value: "-1" }, words.as_drawn), ...titles.map((title, i) => h("option", { value: String(i) }, `${i + 1}. ${title}`)));
    }
    under.value = String(model.get("account"));
    const none = !net || !net.nodes;
    for (const node of [head, stage, table, facts]) node.hidden = none;
    empty.hidden = !none;
    if (none) return;
    setNumber(capacity, `routes/${net.copy}/capacity`, net.capacity, percent(net.capacity));
    const held = net.nodes.filter((node) => node.held).map((node) => node.name);
    say(sentence, held.length ? fill(words.held_by, { names: held.join(", ") }) : words.not_held);
    const room = Math.max(560, Math.floor(stage.clientWidth || 800));
    const now = JSON.stringify([net, room, model.get("selected")]);
    if (told !== now) {
      told = now;
      const held = stage.querySelector(":focus")?.dataset.element;
      stage.replaceChildren(drawNet(net, words, room, model.get("selected"), selector(model), describe));
      if (held) stage.querySelector(`[data-element="${CSS.escape(held)}"]`)?.focus();
      table.replaceChildren(drawTable(net, words));
      const at = net.nodes.findIndex((node) => node.id === model.get("selected"));
      describe(at < 0 ? null : at);
    }
    mark(panel, "data-stamp", model.get("stamp"));
  }

  const sized = new ResizeObserver(() => {
    if (Math.abs(stage.clientWidth - width) < 2) return;
    width = stage.clientWidth;
    draw();
  });
  sized.observe(stage);
  const stop = watch(model, ["net", "choices", "chosen", "accounts", "account", "selected", "stamp"], draw);
  return () => {
    sized.disconnect();
    stop();
  };
}

export default { render };
