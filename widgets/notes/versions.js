// Two versions of case.yaml, field by field, and which one is to stand.
import { h } from "../front/kit.js";

function makeVersion(version, words, tell) {
  const pick = (keep) => tell({ kind: "version", name: version.name, keep });
  return h("section", { class: "bw-version", "data-name": null, "aria-label": version.name },
    version.fault ? h("p", { class: "bw-soft" }, version.fault) : h("table", { class: "bw-course" },
      h("thead", {}, h("tr", {}, [words.field, words.in_place, words.beside].map((label) => h("th", { scope: "col" }, label)))),
      h("tbody", {}, version.rows.map((row) => h("tr", {}, h("th", { scope: "row" }, row.field), [row.one, row.other].map((text) => h("td", { class: "bw-version-text" }, text)))))),
    h("div", { class: "bw-note-acts" },
      h("button", { type: "button", class: "bw-button", onclick: () => pick("in_place") }, words.keep_in_place),
      version.fault ? null : h("button", { type: "button", class: "bw-button", onclick: () => pick("beside") }, words.keep_beside)));
}

/** The versions view; `change(versions)` brings it up to date. */
export function makeVersions(words, tell) {
  const list = h("div", {});
  const lead = h("p", { class: "bw-lead bw-soft" }, words.versions_lead);
  const none = h("p", { class: "bw-empty" }, words.versions_none);
  let shown = null;
  return { node: h("div", {}, lead, list, none), change(versions) {
    lead.hidden = versions.length === 0;
    none.hidden = versions.length > 0;
    const now = JSON.stringify(versions);
    if (now === shown) return;
    shown = now;
    list.replaceChildren(...versions.map((version) => makeVersion(version, words, tell)));
  } };
}
