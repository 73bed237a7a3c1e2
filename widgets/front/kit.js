// Building blocks that the panels share. Text from anywhere reaches the page as text nodes only, never as markup.

const SVG = "http://www.w3.org/2000/svg";

function dress(node, attributes, children) {
  for (const [name, value] of Object.entries(attributes || {})) {
    if (value === null || value === undefined || value === false) continue;
    if (name.startsWith("on")) node.addEventListener(name.slice(2), value);
    else node.setAttribute(name, value === true ? "" : String(value));
  }
  for (const child of children.flat(Infinity)) {
    if (child === null || child === undefined || child === false) continue;
    node.append(child instanceof Node ? child : document.createTextNode(String(child)));
  }
  return node;
}

/** An HTML element: attributes, `on...` listeners, and children (nodes, text, nested lists; null is left out). */
export function h(tag, attributes, ...children) {
  return dress(document.createElement(tag), attributes, children);
}

/** An SVG element, made in the same way. */
export function s(tag, attributes, ...children) {
  return dress(document.createElementNS(SVG, tag), attributes, children);
}

/** Sets text only where it differs, so that a redraw touches few nodes. */
export function say(node, text) {
  const wanted = text === null || text === undefined ? "" : String(text);
  if (node.textContent !== wanted) node.textContent = wanted;
  return node;
}

/** Sets or removes an attribute only where it differs. */
export function mark(node, name, value) {
  if (value === null || value === undefined || value === false) {
    if (node.hasAttribute(name)) node.removeAttribute(name);
  } else {
    const wanted = value === true ? "" : String(value);
    if (node.getAttribute(name) !== wanted) node.setAttribute(name, wanted);
  }
  return node;
}

/** Fills "{name}" in a label from values. */
export function fill(text, values) {
  return String(text).replace(/\{(\w+)\}/g, (whole, name) => (name in values ? String(values[name]) : whole));
}

/** Shows a number and states its name in the API and its unrounded value, so that it can be walked back. */
export function number(name, value, text, attributes) {
  const node = h("span", { class: "bw-number", ...attributes });
  return setNumber(node, name, value, text);
}

/** Changes what a number node shows. */
export function setNumber(node, name, value, text) {
  const known = value !== null && value !== undefined && !Number.isNaN(value);
  mark(node, "data-name", known ? name : null);
  mark(node, "data-value", known ? value : null);
  mark(node, "title", known ? name : null);
  return say(node, known ? text : "–");
}

/**
 * Keeps a parent's children in step with a list: one child a key, made once, changed in place, moved only where
 * the order changed. `make(item)` returns a node; `change(node, item)` brings it up to date.
 */
export function keep(parent, items, key, make, change) {
  const old = parent.$kept || new Map();
  const now = new Map();
  for (const item of items) {
    const id = key(item);
    let node = old.get(id);
    if (node) old.delete(id);
    else node = make(item);
    if (change) change(node, item);
    now.set(id, node);
  }
  for (const node of old.values()) node.remove();
  let place = parent.firstChild;
  for (const node of now.values()) {
    if (node === place) place = place.nextSibling;
    else parent.insertBefore(node, place);
  }
  parent.$kept = now;
}

/** "62 %", with "<1 %" and ">99 %" at the ends, for a share or probability. */
export function percent(value) {
  if (value === null || value === undefined || Number.isNaN(value)) return "–";
  if (value > 0 && value < 0.005) return "<1 %";
  if (value < 1 && value > 0.995) return ">99 %";
  return `${Math.round(value * 100)} %`;
}

/** A number with a fixed count of decimals and a true minus sign. */
export function fixed(value, decimals) {
  if (value === null || value === undefined || Number.isNaN(value)) return "–";
  const text = Math.abs(value).toFixed(decimals);
  return (value < 0 && Number(text) !== 0 ? "\u2212" : "") + text;
}

/** Odds as "8.4 : 1" or "1 : 3.2". */
export function odds(value) {
  if (value === null || value === undefined || Number.isNaN(value)) return "–";
  const plain = (x) => (x >= 1000 ? ">999" : x >= 100 ? x.toFixed(0) : x >= 10 ? x.toFixed(0) : x.toFixed(1));
  return value >= 1 ? `${plain(value)} : 1` : `1 : ${plain(1 / Math.max(value, 1e-12))}`;
}

/** What tells all panels that an element is pointed out. */
export const selector = (model) => (element) => {
  model.set("selected", element);
  model.save_changes();
};

/** Calls `draw` now and when any named trait changes; returns what stops it. */
export function watch(model, names, draw) {
  const events = names.map((name) => `change:${name}`);
  for (const event of events) model.on(event, draw);
  draw();
  return () => events.forEach((event) => model.off(event, draw));
}

/**
 * Keeps keys typed into a panel from the notebook's shortcuts: notebooks take keys on their way down, before the panel
 * hears of them, except below this mark.
 */
export function guardKeys(node) {
  node.setAttribute("data-lm-suppress-shortcuts", "true");
  node.addEventListener("keydown", (event) => event.stopPropagation());
}

/** The frame of every panel: heading, tools, body, and a foot with the caution. */
export function frame(el, words, name, ...tools) {
  const body = h("div", { class: "bw-body" });
  const foot = h("footer", { class: "bw-foot" });
  const title = h("h2", { class: "bw-title" }, words.title);
  const panel = h(
    "section",
    { class: `byway-panel byway-${name}`, "aria-label": words.title },
    h("header", { class: "bw-head" }, title, h("div", { class: "bw-tools" }, ...tools)),
    body,
    foot,
    h("p", { class: "bw-caution" }, words.caution),
  );
  guardKeys(panel);
  el.append(panel);
  return { panel, title, body, foot };
}

/** A row of mutually exclusive buttons; arrow keys move, as in a radio group. `pick(value)` is called on change. */
export function segmented(label, options, value, pick) {
  const group = h("div", { class: "bw-segmented", role: "radiogroup", "aria-label": label });
  const buttons = options.map(([key, text, more]) =>
    h("button", { type: "button", role: "radio", "data-key": key, class: "bw-option", onclick: () => choose(key), ...more },
      text));
  function show(key) {
    for (const button of buttons) {
      const on = button.dataset.key === key;
      mark(button, "aria-checked", on ? "true" : "false");
      mark(button, "tabindex", on ? "0" : "-1");
    }
    if (!buttons.some((button) => button.tabIndex === 0)) mark(buttons[0], "tabindex", "0");
  }
  function choose(key) {
    show(key);
    pick(key);
  }
  group.addEventListener("keydown", (event) => {
    const step = { ArrowRight: 1, ArrowDown: 1, ArrowLeft: -1, ArrowUp: -1 }[event.key];
    if (!step) return;
    event.preventDefault();
    const at = buttons.indexOf(group.getRootNode().activeElement);
    const next = buttons[(at + step + buttons.length) % buttons.length];
    next.focus();
    choose(next.dataset.key);
  });
  group.append(...buttons);
  group.show = show;
  show(value);
  return group;
}

/** The small shape that tells a region (round) from a segment (a strand) without colour. */
export function glyph(kind) {
  const icon = s("svg", { class: `bw-glyph bw-${kind}`, viewBox: "0 0 16 16", "aria-hidden": "true" });
  if (kind === "segment") {
    icon.append(s("path", { d: "M1 11 C5 3 11 13 15 5", fill: "none", "stroke-width": "3", "stroke-linecap": "round" }));
  } else {
    icon.append(s("circle", { cx: "8", cy: "8", r: "5" }));
  }
  return icon;
}

let serial = 0;

/** An id that no other node of the page has. */
export function freshId(stem) {
  serial += 1;
  return `bw-${stem}-${serial}`;
}
