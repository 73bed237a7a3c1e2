// One field of a form: its label, its control, and the faults that the checks found in it.
import { fill, freshId, h, keep, mark, say, segmented } from "../front/kit.js";
import { makeLightbox } from "./lightbox.js";
import { makePicker } from "./picker.js";
import { makeRoutes } from "./routes.js";

const FEW = 7;

function numberInput(label, value, change, { step = "any", min = null, max = null } = {}) {
  const input = h("input", { type: "number", class: "bw-search be-number", step, min, max, "aria-label": label });
  input.value = value ?? "";
  input.addEventListener("input", () => change(input.value === "" ? null : Number(input.value)));
  return input;
}

/** A control that holds nothing (empty text) says null, so that a field that may stay empty is left out. */
function wordField(field, env, change) {
  const node = field.entry === "text" ? h("textarea", { class: "be-text", rows: "2", id: env.id }) : h("input", { type: "text", class: "bw-search be-word", id: env.id });
  node.addEventListener("input", () => change());
  return {
    node,
    get: () => (node.value === "" && !field.needed ? null : node.value),
    set: (value) => { node.value = value ?? ""; },
  };
}

function numberField(field, env, change) {
  const look = { share: { step: 0.05, min: 0, max: 1 }, whole: { step: 1 }, number: { step: 0.5, min: 0 } }[field.entry];
  const node = numberInput(env.label, null, () => change(), look);
  return { node, get: () => (node.value === "" ? null : Number(node.value)), set: (value) => { node.value = value ?? ""; } };
}

function choiceField(field, env, change) {
  const { words } = env;
  const text = (value) => words[`opt_${value}`] || words[`${field.name}_${value}`] || words[`${value}`] || value.replace(/_/g, " ");
  const options = field.options.map((value) => [value, text(value)]);
  let value = "";
  if (options.length > FEW) {
    const picker = makePicker(words, env.label, () => options, (key) => { value = key; change(); });
    return { node: picker.node, get: () => value || null, set: (now) => { value = now || ""; picker.set(value); } };
  }
  const group = segmented(env.label, options, "", (key) => { value = key; change(); });
  return { node: group, get: () => value || null, set: (now) => { value = now || ""; group.show(value); } };
}

const entriesOf = (env, kinds) => kinds.flatMap((kind) => env.catalogue()[kind] || []).map(([key, name]) => [key, name]);

function keyField(field, env, change) {
  const extra = field.name === "accuracy_source" ? [["memory", env.words.checked_memory]] : [];
  const picker = makePicker(env.words, env.label, () => [...extra, ...entriesOf(env, field.kinds)], () => change());
  return { node: picker.node, get: () => picker.get() || null, set: picker.set };
}

function keysField(field, env, change) {
  let keys = [];
  const { words } = env;
  const nameOf = (key) => (entriesOf(env, field.kinds).find(([each]) => each === key) || [key, key])[1];
  const list = h("ul", { class: "be-chips" });
  const picker = makePicker(words, `${env.label}: ${words.add_one}`, () => entriesOf(env, field.kinds).filter(([key]) => !keys.includes(key)),
    (key) => { keys = [...keys, key]; show(); change(); }, { clear: true });
  function show() {
    keep(list, keys, (key) => key, (key) => h("li", { class: "be-chip" }, h("span", {}), h("button", { type: "button", class: "be-off",
      "aria-label": fill(words.remove, { name: key }), onclick: () => { keys = keys.filter((each) => each !== key); show(); change(); } }, "×")),
    (li, key) => say(li.firstChild, nameOf(key)));
  }
  return { node: h("div", { class: "be-keys" }, list, picker.node), get: () => [...keys], set: (now) => { keys = [...(now || [])]; show(); } };
}

function placeField(field, env, change) {
  const { words } = env;
  let side = "";
  const picker = makePicker(words, env.label, () => entriesOf(env, field.kinds), () => change(), { free: true });
  const group = segmented(fill(words.side_of, { name: env.label }), [["", words.same_side], ["other", words.other_side], ["left", words.left_only], ["right", words.right_only]],
    "", (key) => { side = key; change(); });
  return {
    node: h("div", { class: "be-place" }, picker.node, group),
    get: () => (picker.get() ? picker.get() + (side ? `@${side}` : "") : null),
    set: (value) => {
      const [bare, at] = String(value || "").split("@");
      side = at || "";
      picker.set(bare);
      group.show(side);
    },
  };
}

function pointsField(field, env, change) {
  const { words } = env;
  const ordered = field.name === "waypoints_mni";
  let points = [];
  const body = h("tbody", {});
  const table = h("table", { class: "be-points" }, h("thead", {}, h("tr", {}, h("th", {}, ""), ["x", "y", "z"].map((axis) => h("th", { scope: "col" }, axis)), h("th", {}, ""))), body);
  const box = makeLightbox(words, {
    ordered,
    change: (now, done) => {
      points = now;
      rows();
      change(done);
    },
    choose: (n) => [...body.rows].forEach((row, i) => row.classList.toggle("be-row-chosen", i === n)),
    look: (mm) => env.send({ kind: "look", mm }),
    ask: () => env.slices(box),
  });
  box.setFocus(env.crosshair());
  const told = h("p", { class: "bw-soft be-course", role: "status" });
  const here = () => env.crosshair().map((x) => Math.round(x * 2) / 2);
  const add = h("button", { type: "button", class: "bw-button be-at-cross", onclick: () => box.add(here()) }, words.add_at_crosshair);
  const ends = ordered ? h("button", { type: "button", class: "bw-button", onclick: () => env.ends().length && write(env.ends()) }, words.from_ends) : null;

  function write(now) {
    points = now;
    box.setPoints(points);
    rows();
    change(true);
  }
  const cell = (n, axis) => {
    const input = numberInput(`${fill(words.point, { n: n + 1 })}, ${"xyz"[axis]}`, 0, (value) => {
      if (value === null) return;
      points = points.map((p, i) => (i === n ? p.map((v, a) => (a === axis ? value : v)) : p));
      box.setPoints(points);
      box.select(n);
      change(true);
    }, { step: 1 });
    return h("td", {}, input);
  };
  function rows() {
    while (body.rows.length > points.length) body.rows[body.rows.length - 1].remove();
    while (body.rows.length < points.length) {
      const n = body.rows.length;
      body.append(h("tr", {}, h("th", { scope: "row" }, h("button", { type: "button", class: "be-point", "aria-label": fill(words.point, { n: n + 1 }), onclick: () => {
        box.select(n);
        box.goThere();
      }, title: words.go_to_point }, String(n + 1))), [0, 1, 2].map((axis) => cell(n, axis)), h("td", {},
        h("button", { type: "button", class: "be-small", title: words.take_crosshair_hint, onclick: () => write(points.map((p, i) => (i === n ? here() : p))) }, words.take_crosshair),
        h("button", { type: "button", class: "be-off", "aria-label": fill(words.remove, { name: fill(words.point, { n: n + 1 }) }), onclick: () => write(points.filter((_, i) => i !== n)) }, "×"))));
    }
    points.forEach((p, n) => p.forEach((value, axis) => {
      const input = body.rows[n].cells[axis + 1].firstChild;
      if (Number(input.value) !== value || input.value === "") input.value = value;
    }));
    table.hidden = !points.length;
  }
  rows();
  return {
    node: h("div", { class: "be-waypoints" }, box.node, h("p", { class: "bw-soft be-hint" }, words.lightbox_hint), told, table, h("div", { class: "be-row" }, add, ends)),
    get: () => points.map((p) => [...p]),
    set: (now) => { points = (now || []).map((p) => p.map(Number)); box.setPoints(points); rows(); },
    course: (now, text) => { box.setCourse(now); say(told, text); },
    box,
    stop: () => box.stop(),
  };
}

function dependsField(field, env, change) {
  const { words } = env;
  let items = [];
  const list = h("ul", { class: "be-list" });
  const nameOf = (key) => (entriesOf(env, ["function"]).find(([each]) => each === key) || [key, key])[1];
  const starts = env.starts();
  const picker = makePicker(words, `${env.label}: ${words.add_one}`, () => entriesOf(env, ["function"]).filter(([key]) => !items.some((item) => item.function === key)),
    (key) => { items = [...items, { function: key }]; show(); change(); }, { clear: true });
  const put = (key, name, value) => {
    items = items.map((item) => (item.function === key ? { ...item, [name]: value } : item));
    change();
  };
  function show() {
    keep(list, items, (item) => item.function, (item) => {
      const key = item.function;
      const name = nameOf(key);
      const thresholds = () => [...(items.find((each) => each.function === key).thresholds || starts.thresholds)];
      return h("li", { class: "be-card" }, h("strong", {}, name), h("button", { type: "button", class: "be-off", "aria-label": fill(words.remove, { name }),
        onclick: () => { items = items.filter((each) => each.function !== key); show(); change(); } }, "×"),
      h("div", { class: "be-row" }, h("span", { class: "bw-soft" }, words.weight), numberInput(`${words.weight}, ${name}`, item.weight ?? starts.weight, (v) => put(key, "weight", v), { step: 0.05, min: 0, max: 1 }),
        h("span", { class: "bw-soft" }, words.thresholds), [0, 1, 2].map((n) => numberInput(`${words.thresholds}, ${n + 1}, ${name}`, thresholds()[n], (v) => {
          const now = thresholds();
          now[n] = v;
          put(key, "thresholds", now);
        }, { step: 0.05, min: 0, max: 1 }))));
    });
  }
  return { node: h("div", { class: "be-keys" }, list, picker.node), get: () => items.map((item) => ({ ...item })), set: (now) => { items = (now || []).map((item) => ({ ...item })); list.replaceChildren(); list.$kept = null; show(); } };
}

const MAKERS = { word: wordField, text: wordField, number: numberField, share: numberField, whole: numberField, choice: choiceField, key: keyField,
  keys: keysField, place: placeField, points: pointsField, routes: makeRoutes, depends: dependsField };

/** A field with its label and faults. `env` gives words, catalogue(), crosshair(), send, ...; `change(field, done)`. */
export function makeField(field, kind, env, change) {
  const { words } = env;
  const id = freshId(field.name);
  const label = words[`field_${kind}_${field.name}`] || words[`field_${field.name}`] || words[field.name] || field.name;
  const made = MAKERS[field.entry](field, { ...env, label, id }, (done = true) => change(field.name, done));
  const faults = h("ul", { class: "be-faults", id: `${id}-faults`, "aria-live": "polite" });
  const plain = field.entry === "word" || field.entry === "text";
  const node = h("div", { class: `be-field be-field-${field.entry} ${field.options && field.options.length > 3 ? "be-wide" : ""}`, "data-field": field.name },
    h(plain ? "label" : "div", { class: "be-label", for: plain ? id : null }, label, field.needed ? null : h("span", { class: "bw-soft" }, ` (${words.optional})`)), made.node, faults);
  return {
    ...made, node, name: field.name, entry: field.entry,
    showFaults: (found) => {
      keep(faults, found, (fault) => fault.text, (fault) => h("li", { class: fault.grave ? "be-grave" : "be-mild" }, fault.text));
      node.classList.toggle("be-broken", found.some((fault) => fault.grave));
      mark(made.node, "aria-describedby", found.length ? `${id}-faults` : null);
    },
  };
}
