// Small pieces that cards and tables of accounts share.
import { glyph, h } from "../front/kit.js";

const RANK = { mild: 1, moderate: 2, severe: 3 };

/** Rebuilds a node's children only when what they show has changed. */
export function redo(node, value, build) {
  const now = JSON.stringify(value);
  if (node.$shown === now) return;
  node.$shown = now;
  node.replaceChildren(...[build(value)].flat(Infinity).filter(Boolean));
}

/** A chip that names an element and selects it. */
export function chip(element, words, select) {
  return h("button", { type: "button", class: "bw-chip", "data-element": element.id, onclick: () => select(element.id) },
    glyph(element.kind), h("span", {}, element.name), h("span", { class: "bw-side", title: words[element.side] }, words[`${element.side}_short`]));
}

/** A grade as filled pips, with its word for those who cannot see them; absent and not tested are words. */
export function grade(found, words) {
  if (!RANK[found]) return h("span", { class: "bw-grade bw-soft" }, words[found] || words.not_tested);
  return h("span", { class: "bw-grade", title: words[found] },
    h("span", { class: "bw-pips", "aria-hidden": "true" }, [1, 2, 3].map((i) => h("i", { class: i <= RANK[found] ? "bw-on" : "" }))),
    " ", words[found]);
}

/** The name of a sign with its side of the body or field. */
export function signName(item, words) {
  return [item.name, item.side && item.side !== "none" ? h("span", { class: "bw-soft" }, ` ${words[`body_${item.side}`]}`) : null];
}

/** A citation: authors, year, container; whether its text was read; no link leaves the machine unasked. */
export function citation(source, words) {
  return h("span", { class: "bw-cite" }, source.text, source.doi ? h("span", { class: "bw-soft" }, ` doi:${source.doi}`) : null,
    " ", h("span", { class: "bw-tag", title: words[`checked_${source.checked}_hint`] }, words[`checked_${source.checked}`]));
}

/** Claims with what they say, how strong they are, and their sources. */
export function claimList(claims, words) {
  return h("ul", { class: "bw-claims" }, claims.map((claim) => h("li", { class: `bw-claim bw-stance-${claim.stance}` },
    h("p", {}, claim.says, " ",
      h("span", { class: "bw-tag" }, words[`grade_${claim.grade}`]), " ",
      h("span", { class: "bw-tag" }, words[`kind_${claim.kind}`]), " ",
      h("span", { class: "bw-tag" }, words[`population_${claim.population}`])),
    h("p", { class: "bw-soft" }, claim.sources.map((source) => citation(source, words))),
    claim.note ? h("p", { class: "bw-soft" }, claim.note) : null)));
}
