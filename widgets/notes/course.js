// The visits of a case side by side: what changed in damage, capacity, signs and posteriors.
import { fill, fixed, h, number, percent } from "../front/kit.js";

function cell(name, value) {
  return h("td", { class: "bw-right bw-course-cell" }, number(name, value, percent(value)),
    h("i", { class: "bw-course-bar", style: `width:${Math.max(0, Math.min(1, value)) * 100}%`, "aria-hidden": "true" }));
}

function change(values) {
  const points = Math.round((values[values.length - 1] - values[0]) * 100);
  return `${points > 0 ? "+" : points < 0 ? "\u2212" : ""}${Math.abs(points)}`;
}

function block(name, told, rows, words) {
  if (!rows.length) return null;
  return h("section", { class: "bw-course-block" }, h("h3", {}, words[`course_${name}`]), h("table", { class: "bw-course" },
    h("thead", {}, h("tr", {}, h("th", { scope: "col" }), told.visits.map((visit) => h("th", { scope: "col", class: "bw-right" }, visit)),
      h("th", { scope: "col", class: "bw-right" }, words.change))),
    h("tbody", {}, rows.map((row) => h("tr", { "data-key": row.key }, h("th", { scope: "row" }, row.label), row.values.map((value, i) => cell(`course/${name}/${row.key}/${told.visits[i]}`, value)),
      h("td", { class: "bw-right" }, change(row.values)))))));
}

function signs(told, words) {
  if (!told.signs.length) return null;
  return h("section", { class: "bw-course-block" }, h("h3", {}, words.course_signs), h("table", { class: "bw-course" },
    h("thead", {}, h("tr", {}, h("th", { scope: "col" }), told.visits.map((visit) => h("th", { scope: "col" }, visit)))),
    h("tbody", {}, told.signs.map((row) => h("tr", {}, h("th", { scope: "row" }, row.label),
      row.found.map((found, i) => h("td", {}, found === "absent" || found === "not tested" ? words[found] : h("strong", {}, words[found] || found),
        " ", number(`course/signs/${row.key}/${told.visits[i]}`, row.expected[i], percent(row.expected[i]), { class: "bw-number bw-soft" }))))))));
}

/** The course view; `change(visits, told)` brings it up to date. */
export function makeCourse(words, tell) {
  const out = h("div", {});
  const wait = h("span", { class: "bw-soft", role: "status" });
  const ask = h("button", { type: "button", class: "bw-button bw-primary", onclick: () => {
    wait.textContent = words.course_working;
    tell({ kind: "course" });
  } }, words.course_reckon);
  const none = h("p", { class: "bw-empty" }, words.course_none);
  const node = h("div", {}, h("p", { class: "bw-lead bw-soft" }, words.course_lead), ask, " ", wait, none, out);
  let shown = null;

  return { node, change(visits, told) {
    none.hidden = visits > 0;
    ask.hidden = visits === 0;
    const now = JSON.stringify(told);
    if (now === shown) return;
    shown = now;
    wait.textContent = "";
    if (!told.visits) {
      out.replaceChildren();
      return;
    }
    out.replaceChildren(...[
      h("ol", { class: "bw-course-visits" }, told.visits.map((visit, i) => h("li", {}, h("strong", {}, visit), ` ${words[`stage_${told.stages[i]}`] || told.stages[i]}, `,
        fill(words.course_lesion, { ml: fixed(told.volumes_ml[i], 1) })))),
      signs(told, words), block("damage", told, told.damage, words), block("functions", told, told.functions, words),
      block("accounts", told, told.accounts, words)].filter(Boolean));
  } };
}
