// What to do next: tests and images that would tell the accounts apart, in bits, with their burden.
import { fixed, h, number } from "../front/kit.js";
import { chip, signName } from "./parts.js";

function bitsBar(bits, most) {
  return h("span", { class: "bw-bits", "aria-hidden": "true" }, h("i", { style: `width:${(bits / most) * 100}%` }));
}

/** Untested signs, most telling first. */
export function nextTests(rows, words) {
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
          h("td", {}, row.if_present), h("td", {}, row.if_absent));
      })))];
}

/** Damage estimates that are worth knowing better. */
export function nextImages(rows, words, select) {
  const most = Math.max(1e-9, ...rows.map((row) => row.bits));
  return [h("h3", {}, words.next_images), h("p", { class: "bw-soft" }, words.next_images_hint),
    h("ul", { class: "bw-images" }, rows.map((row) => h("li", {}, chip(row.element, words, select), bitsBar(row.bits, most),
      h("span", {}, number(`next_images/${row.element.id}/bits`, row.bits, fixed(row.bits, 2)), ` ${words.bits_unit}`))))];
}
