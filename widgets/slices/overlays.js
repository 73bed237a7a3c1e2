// Which regions and segments are outlined or filled on the films, and the maps that can lie over them.
import { glyph, h, keep, mark, percent, say } from "../front/kit.js";
import { toggle } from "./controls.js";
import { CHANCE_SCALE, EFFECT_SCALE, OVERLAYS } from "./looks.js";

function bar(scale, low, high) {
  const canvas = h("canvas", { width: "256", height: "1", class: "bs-scale", "aria-hidden": "true" });
  const ctx = canvas.getContext("2d");
  const image = ctx.createImageData(256, 1);
  image.data.set(scale);
  ctx.putImageData(image, 0, 0);
  return h("div", { class: "bs-legend" }, h("span", {}, low), canvas, h("span", {}, high));
}

/** Id, key, side and readable name of an element by position. */
export function elementOf(store, position) {
  const id = store.elements.ids[position];
  const [key, side] = id.split("@");
  return { id, key, side, position, segment: key.includes("."), name: store.elements.names[key] || key };
}

export function overlays(view) {
  const { words, look, store } = view;
  const search = h("input", { type: "search", class: "bw-search bs-find", placeholder: words.find_element, "aria-label":
    words.find_element, list: view.listId });
  const options = h("datalist", { id: view.listId });
  const list = h("ul", { class: "bs-shown" });
  let byText = null;
  let from = null;
  const fillOptions = () => {
    if (byText && from === store.elements) return;
    if (!store.elements) {
      if (!store.elements && store.hasElements) store.volume("elements");
      return;
    }
    from = store.elements;
    byText = new Map(store.elements.ids.map((_, n) => {
      const e = elementOf(store, n);
      return [`${e.name}, ${words[e.side]}`, e];
    }));
    options.replaceChildren(...[...byText.keys()].map((text) => h("option", { value: text })));
  };
  search.addEventListener("focus", fillOptions);
  search.addEventListener("change", () => {
    const found = byText && byText.get(search.value);
    if (!found) return;
    view.outline(found.id, false);
    search.value = "";
  });
  const graded = toggle(words.show_graded, () => look.showGraded, (on) => look.set({ showGraded: on }));
  const drop = h("button", { type: "button", class: "bs-button bs-small", onclick: () =>
    view.command({ op: "remove_graded" }) }, words.remove_graded);
  const scale = bar(EFFECT_SCALE, "0", "1");
  const meaning = h("p", { class: "bw-soft" });
  const uncharted = toggle(words.show_uncharted, () => look.showUncharted, (on) => look.set({ showUncharted: on }),
    words.show_uncharted_more);
  const chance = toggle(words.show_chance, () => look.showChance, (on) => look.set({ showChance: on }), words.show_chance_more);
  const chanceScale = bar(CHANCE_SCALE, "0 %", "100 %");
  const node = h("details", { class: "bs-section" }, h("summary", {}, h("h3", {}, words.overlays)), search, options, list,
    uncharted, chance, chanceScale, graded, scale, meaning, drop);
  node.addEventListener("toggle", () => node.open && fillOptions());
  const make = (item) => {
    const e = elementOf(store, item.position);
    const fill = h("button", { type: "button", class: "bs-button bs-small", onclick: () => {
      look.set({ shown: look.shown.map((s) => (s.position === item.position ? { ...s, fill: !s.fill, passing: false } : s)) });
    } });
    const off = h("button", { type: "button", class: "bs-button bs-small", "aria-label": `${words.hide} ${e.name}`, onclick: () =>
      look.set({ shown: look.shown.filter((s) => s.position !== item.position) }) }, "×");
    const dot = h("i", { class: "bs-dot" });
    const share = h("span", { class: "bw-number bw-soft" });
    const row = h("li", {}, dot, glyph(e.segment ? "segment" : "region"), h("span", { class: "bs-shown-name" }, e.name),
      h("span", { class: "bw-side", title: words[e.side] }, words[`${e.side}_short`] || ""), share, fill, off);
    row.change = (now, n) => {
      dot.style.background = OVERLAYS[n % OVERLAYS.length];
      say(fill, now.fill ? words.as_outline : words.as_fill);
      say(share, store.share ? percent(store.share[now.position]) : "");
    };
    return row;
  };
  node.refresh = () => {
    fillOptions();
    keep(list, look.shown, (s) => s.position, make, (row, s) => row.change(s, look.shown.indexOf(s)));
    [graded, uncharted, chance].forEach((item) => item.refresh());
    for (const item of [graded, scale, meaning, drop]) item.hidden = !store.gradedScale;
    say(meaning, store.gradedScale || "");
    chanceScale.hidden = !look.showChance;
    mark(search, "disabled", !store.hasElements);
  };
  return node;
}
