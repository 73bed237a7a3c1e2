// Beside the films: compartments, and what can be done to what is drawn.
import { h, keep, mark, setNumber } from "../front/kit.js";
import { slider } from "./controls.js";
import { icon } from "./icons.js";
import { COMPARTMENTS, swatch } from "./looks.js";

const ml = (value) => `${value < 10 ? value.toFixed(1) : value.toFixed(0)} ml`;

function makeCompartment(view, n) {
  const { look, words } = view;
  const style = () => view.store.styles[n];
  const change = (values) => view.command({ op: "compartment", compartment: n, ...values });
  const name = h("input", { type: "text", class: "bs-name", maxlength: "60", "aria-label": words.compartment_name,
    onchange: () => change({ name: name.value }) });
  const kind = h("select", { "aria-label": words.compartment_kind, onchange: () => change({ kind: kind.value }) },
    ["core", "oedema", "other"].map((k) => h("option", { value: k }, words[`kind_${k}`])));
  const volume = h("span", { class: "bs-ml bw-number" });
  const effect = slider(words.effect, [0, 1, 0.05], 1, (v) => v.toFixed(2), (v, last) => last && change({ effect: v }));
  const pick = h("button", { type: "button", class: "bs-pick", role: "radio", onclick: () => look.set({ compartment: n }) },
    swatch(COMPARTMENTS[n]));
  const drop = h("button", { type: "button", class: "bs-button bs-small", title: words.remove_compartment, "aria-label":
    words.remove_compartment, onclick: () => view.removeCompartment(n) }, icon("remove"));
  const node = h("div", { class: "bs-compartment", role: "none", onclick: (event) => {
    if (!event.target.closest("button, input, select")) look.set({ compartment: n });
  } }, pick, name, kind, volume, drop, effect);
  node.refresh = () => {
    const s = style();
    if (!s) return;
    if (document.activeElement !== name) name.value = s.name;
    kind.value = s.kind;
    effect.show(s.effect);
    // The lesion leaves empty compartments out, so the number's name counts the others.
    const drawn = view.store.ml[n] > 0;
    const place = view.store.ml.slice(0, n).filter((v) => v > 0).length;
    setNumber(volume, `lesion.compartments[${place}].volume_ml`, drawn ? view.store.ml[n] : null, ml(view.store.ml[n] || 0));
    mark(pick, "aria-label", s.name);
    mark(pick, "aria-checked", look.compartment === n ? "true" : "false");
    mark(pick, "tabindex", look.compartment === n ? "0" : "-1");
    mark(node, "data-on", look.compartment === n);
    drop.hidden = view.store.styles.length < 2;
  };
  return node;
}

export function compartments(view) {
  const { words } = view;
  const list = h("div", { class: "bs-compartments", role: "radiogroup", "aria-label": words.compartments });
  const add = h("button", { type: "button", class: "bs-button", onclick: () => view.addCompartment() }, icon("add"),
    words.add_compartment);
  const node = h("section", { class: "bs-section" }, h("h3", {}, words.compartments), list, add);
  node.refresh = () => {
    const { styles } = view.store;
    keep(list, styles.map((_, n) => n), (n) => n, (n) => makeCompartment(view, n), (item) => item.refresh());
    add.hidden = styles.length >= COMPARTMENTS.length;
  };
  return node;
}

/** Grow, shrink, fill between, mirror, threshold, clear. */
export function shapeTools(view) {
  const { words, look } = view;
  const amount = slider(words.by, [1, 10, 1], look.mm, (v) => `${v} mm`, (v) => look.set({ mm: v }));
  const button = (word, run, title) => h("button", { type: "button", class: "bs-button", title, onclick: run }, words[word]);
  const range = thresholdTool(view);
  const node = h("details", { class: "bs-section", open: true }, h("summary", {}, h("h3", {}, words.reshape)),
    amount,
    h("div", { class: "bs-buttons" }, button("grow_by", () => view.resize(look.mm)),
      button("shrink_by", () => view.resize(-look.mm)), button("fill_between", () => view.fillBetween(), words.fill_between_more),
      button("mirror", () => view.command({ op: "mirror", compartment: null }), words.mirror_more),
      button("clear", () => view.command({ op: "clear", compartment: look.compartment }), words.clear_more)),
    range);
  node.refresh = () => {
    amount.show(look.mm);
    range.refresh();
  };
  return node;
}

function thresholdTool(view) {
  const { words, look, store } = view;
  const low = h("input", { type: "number", step: "any", "aria-label": words.threshold_low });
  const high = h("input", { type: "number", step: "any", "aria-label": words.threshold_high });
  const within = h("select", { "aria-label": words.threshold_within },
    ["brain", "lesion", "sphere"].map((key) => h("option", { value: key }, words[`within_${key}`])));
  const show = () => {
    if (low.value === "" || high.value === "") return;
    look.set({ range: { scan: look.scan, low: Number(low.value), high: Number(high.value) } });
  };
  low.addEventListener("input", show);
  high.addEventListener("input", show);
  const lay = h("button", { type: "button", class: "bs-button bs-strong", onclick: () => {
    view.command({ op: "threshold", ...look.range, within: within.value, compartment: look.compartment, spare: look.spare,
      centre: view.cursor, reach_mm: look.reach });
    look.set({ range: null });
    node.open = false;
  } }, words.lay);
  const node = h("details", { class: "bs-threshold" }, h("summary", {}, words.threshold),
    h("div", { class: "bs-fields" }, low, h("span", {}, "–"), high, within, lay));
  node.addEventListener("toggle", () => {
    if (!node.open) look.set({ range: null });
    else if (low.value === "" && store.scans.length) {
      const [a, b] = look.windowOf(store.scans.find((s) => s.key === look.scan));
      low.value = Math.round(a + (b - a) * 0.75);
      high.value = Math.round(b);
      show();
    } else show();
  });
  node.refresh = () => {
    lay.disabled = !look.range;
  };
  return node;
}
