// Coverage of knowledge as a picture: per pathway the sources behind its claims, and how many claims rest on one.
import { fill, h, keep, mark, s, say, segmented } from "../front/kit.js";

const DOT = 9;
const DOTS = 24;
const BAR = 120;

export function makeCoverage(env) {
  const { words } = env;
  let now = null;
  let view = "thin";
  const counts = h("p", {});
  const board = h("div", { class: "be-coverage" });
  const claims = h("ul", { class: "be-changes be-weak" });
  const group = segmented(words.coverage_show, ["thin", "all", "claims"].map((key) => [key, words[`coverage_${key}`]]), view, (key) => {
    view = key;
    draw();
  });
  const key = h("p", { class: "bw-soft be-hint" }, words.coverage_key);
  const node = h("div", {}, h("p", { class: "bw-soft" }, words.coverage_hint), counts, h("div", { class: "be-row" }, group), board, key, claims);

  function row(item, most) {
    const read = Math.round((item.read_share || 0) * item.sources);
    const label = fill(words.coverage_label, { name: item.name, studied: words[`studied_${item.studied}`], sources: item.sources, read, claims: item.claims, one: item.one_source, memory: item.memory_only, disputes: item.disputes });
    const shown = Math.min(item.sources, DOTS);
    const dots = s("svg", { class: "be-dots", width: DOTS * DOT + 30, height: 14, "aria-hidden": "true" },
      Array.from({ length: shown }, (_, n) => s("circle", { cx: n * DOT + 5, cy: 7, r: 3.2, class: n < read ? "be-read" : "be-memory" })),
      item.sources > DOTS ? s("text", { x: DOTS * DOT + 4, y: 11 }, `+${item.sources - DOTS}`) : null);
    const width = (count) => (most ? (count / most) * BAR : 0);
    const bar = s("svg", { class: "be-bars", width: BAR + 34, height: 14, "aria-hidden": "true" },
      s("defs", {}, s("pattern", { id: `be-hatch-${item.pathway}`, width: 4, height: 4, patternUnits: "userSpaceOnUse", patternTransform: "rotate(45)" }, s("rect", { width: 1.6, height: 4, class: "be-hatch" }))),
      s("rect", { x: 0.5, y: 2.5, width: Math.max(0, width(item.one_source)), height: 9, fill: `url(#be-hatch-${item.pathway})`, class: "be-one" }),
      s("rect", { x: width(item.one_source) + 0.5, y: 2.5, width: Math.max(0, width(item.claims - item.one_source)), height: 9, class: "be-several" }),
      item.disputes ? s("path", { d: `M${width(item.claims) + 10} 2l5 5l-5 5l-5 -5z`, class: "be-disputed" }) : null);
    return h("div", { class: `be-cover-row ${item.thin ? "be-thin" : ""}`, role: "img", "aria-label": label, title: label, "data-pathway": item.pathway },
      h("span", { class: "be-cover-name" }, item.name), h("span", { class: `bw-tag be-studied-${item.studied}` }, words[`studied_${item.studied}`]), dots, bar);
  }

  function draw() {
    if (!now) return;
    const { counts: all } = now;
    say(counts, fill(words.coverage_counts, { thin: all.thin, pathways: all.pathways, claims: all.claims, one: all.one_source, memory: all.memory_only }));
    const most = Math.max(1, ...now.pathways.map((item) => item.claims));
    const rows = view === "claims" ? [] : now.pathways.filter((item) => view === "all" || item.thin);
    board.replaceChildren(...(rows.length ? [h("div", { class: "be-cover-row be-cover-head", "aria-hidden": "true" }, h("span", {}, words.of_pathway), h("span", {}, words.field_studied), h("span", {}, words.coverage_sources), h("span", {}, words.coverage_claim))] : []), ...rows.map((item) => row(item, most)));
    key.hidden = view === "claims";
    claims.hidden = view !== "claims";
    if (view === "claims") {
      keep(claims, now.claims, (claim) => claim.claim, (claim) => h("li", {}, h("button", { type: "button", class: "be-link-name", onclick: () => env.open("claim", claim.claim) }, claim.says), " ",
        claim.one_source ? h("span", { class: "bw-tag" }, words.one_source) : null, " ", claim.memory_only ? h("span", { class: "bw-tag" }, words.memory_only) : null,
        h("span", { class: "bw-soft" }, ` ${claim.sources}`)));
    }
    mark(board, "data-rows", rows.length);
  }
  return { node, show: (told) => { if (told.pathways) { now = told; draw(); } } };
}
