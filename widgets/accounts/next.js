// What to do next: tests and images that would tell the accounts apart, in bits, with their burden.
import { fill, fixed, h, number, percent } from "../front/kit.js";
import { chip, signName } from "./parts.js";

function bitsBar(bits, most) {
  return h("span", { class: "bw-bits", "aria-hidden": "true" }, h("i", { style: `width:${(bits / most) * 100}%` }));
}

/** Which account would lead after an outcome, by its number and title, and how likely it would then be. */
function leader(row, outcome, kinds, words) {
  const then = row[`then_${outcome}`] || [];
  const strip = h("span", { class: "bw-mini", role: "img", "aria-label": then.slice(0, 4).map((p, i) => `${i + 1}: ${percent(p)}`).join(", ") },
    then.map((p, i) => h("i", { class: "bw-share", "data-rank": i < 6 ? i + 1 : "rest", style: `flex-grow:${Math.max(p, 0.002)}` })));
  return [leaderWords(row, outcome, kinds, words), strip];
}

function leaderWords(row, outcome, kinds, words) {
  const rank = row[`rank_if_${outcome}`];
  const chance = number(`next_tests/${row.sign}@${row.side}/p_if_${outcome}`, row[`p_if_${outcome}`], percent(row[`p_if_${outcome}`]));
  const title = row[`if_${outcome}`];
  if (rank === null) return h("span", {}, title, ", ", chance);
  const told = fill(rank === 0 ? words.still_leads : words.now_leads, { number: rank + 1, title: words[`account_${kinds[rank]}`] || title });
  return h("span", { title }, told, " ", chance);
}

/** Untested signs, most telling first. */
export function nextTests(rows, kinds, words) {
  const most = Math.max(1e-9, ...rows.map((row) => row.bits));
  return [h("h3", {}, words.next_tests), h("p", { class: "bw-soft" }, words.next_tests_hint),
    h("table", { class: "bw-next-table" },
      h("thead", {}, h("tr", {}, h("th", { scope: "col" }, words.sign), h("th", { scope: "col", colspan: 2, title: words.bits_hint }, words.bits),
        h("th", { scope: "col", class: "bw-right" }, words.burden), h("th", { scope: "col" }, words.if_present), h("th", { scope: "col" }, words.if_absent))),
      h("tbody", {}, rows.map((row) => {
        const path = `next_tests/${row.sign}@${row.side}`;
        return h("tr", {}, h("th", { scope: "row" }, signName(row, words)), h("td", { class: "bw-bits-cell" }, bitsBar(row.bits, most)),
          h("td", { class: "bw-right" }, number(`${path}/bits`, row.bits, fixed(row.bits, 2))),
          h("td", { class: "bw-right" }, number(`${path}/minutes`, row.minutes, fixed(row.minutes, 0)), ` ${words.min}`),
          h("td", {}, leader(row, "present", kinds, words)), h("td", {}, leader(row, "absent", kinds, words)));
      })))];
}

/** Damage estimates that are worth knowing better. */
export function nextImages(rows, words, select) {
  const most = Math.max(1e-9, ...rows.map((row) => row.bits));
  return [h("h3", {}, words.next_images), h("p", { class: "bw-soft" }, words.next_images_hint),
    h("ul", { class: "bw-images" }, rows.map((row) => h("li", {}, chip(row.element, words, select), bitsBar(row.bits, most),
      h("span", {}, number(`next_images/${row.element.id}/bits`, row.bits, fixed(row.bits, 2)), ` ${words.bits_unit}`))))];
}

/** What knowing one thing about the person or the scan for certain would tell. */
export function nextAxes(rows, words) {
  const most = Math.max(1e-9, ...rows.map((row) => row.bits));
  return [h("h3", {}, words.next_axes), h("p", { class: "bw-soft" }, words.next_axes_hint),
    h("ul", { class: "bw-images" }, rows.map((row) => h("li", {}, h("span", { class: "bw-axis" }, h("strong", {}, words[`axis_${row.axis}`]), h("span", { class: "bw-soft" }, ` ${row.image}`)), bitsBar(row.bits, most),
      h("span", {}, number(`next_axes/${row.axis}/bits`, row.bits, fixed(row.bits, 2)), ` ${words.bits_unit}`))))];
}
