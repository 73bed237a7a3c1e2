// The form: which record, what to do with it, its fields; and beside it the checks, the changes and the effect.
import { fill, fixed, h, keep, mark, percent, say, segmented } from "../front/kit.js";
import { makeField } from "./fields.js";
import { makePicker } from "./picker.js";
import { drawPicture } from "./picture.js";

const slug = (text) => text.normalize("NFKD").toLowerCase().replace(/[̀-ͯ]/g, "").replace(/[^a-z0-9]+/g, "_").replace(/^[_0-9]+|_+$/g, "").slice(0, 90).replace(/_+$/, "");
const same = (a, b) => JSON.stringify(a) === JSON.stringify(b);
const REST_MS = 220;

export function makeForm(env) {
  const { words, send } = env;
  const kinds = ["segment", "claim", "function", "source", "region", "sign", "pathway"];
  let n = 0;
  let timer = null;
  let now = null; // {of, key, action, base, fields: Map, keyTouched, touched: Set}
  const kept = new Map();
  let wanted = "segment";

  const kindGroup = segmented(words.kinds, kinds.map((kind) => [kind, words[`of_${kind}`]]), wanted, (kind) => openNew(kind));
  const recordPicker = makePicker(words, words.record, () => (env.catalogue()[wanted] || []).map(([key, name]) => [key, name]), (key) => openRecord(wanted, key),
    { placeholder: words.record_hint });
  const fresh = h("button", { type: "button", class: "bw-button", onclick: () => { kept.delete(`${wanted}/`); openNew(wanted); } }, words.begin_new);
  const actions = segmented(words.actions, ["change", "retire", "dispute"].map((action) => [action, words[`action_${action}`], { title: words[`action_${action}_hint`] }]), "change", (action) => {
    now.action = action;
    show();
    later();
  });
  const actionRow = h("div", { class: "be-row" }, actions);
  const place = h("div", { class: "be-fields" });
  const pathwayPicker = makePicker(words, words.field_pathway, () => (env.catalogue().pathway || []).map(([key, name]) => [key, name]), () => touched("key"), { placeholder: words.field_pathway });
  const keyInput = h("input", { type: "text", class: "bw-search be-word be-key", spellcheck: "false", "aria-label": words.key, title: words.key_hint, oninput: () => {
    now.keyTouched = keyInput.value !== "";
    touched("key");
  } });
  const keyFaults = h("ul", { class: "be-faults", "aria-live": "polite" });
  const keyRow = h("div", { class: "be-field", "data-field": "key" }, h("div", { class: "be-label" }, words.key), h("div", { class: "be-row" }, pathwayPicker.node, keyInput), keyFaults);
  const reason = h("textarea", { class: "be-text", rows: "2", "aria-label": words.reason, oninput: () => later() });
  const reasonFaults = h("ul", { class: "be-faults", "aria-live": "polite" });
  const reasonRow = h("div", { class: "be-field", "data-field": "reason" }, h("div", { class: "be-label" }, words.reason), reason, reasonFaults);

  // -- beside the form
  const verdict = h("p", { class: "be-verdict", role: "status" });
  const others = h("ul", { class: "be-faults be-others" });
  const changes = h("ul", { class: "be-changes" });
  const picture = h("div", { class: "be-picture" });
  const effectWords = h("p", { class: "be-effect-words", role: "status" });
  const effectRows = h("tbody", {});
  const effectTable = h("table", { class: "be-effect" }, h("thead", {}, h("tr", {}, h("th", { scope: "col" }, words.effect_account), h("th", { scope: "col" }, words.effect_before), h("th", { scope: "col" }, words.effect_after))), effectRows);
  const keepButton = h("button", { type: "button", class: "bw-button be-keep", onclick: () => submit("keep") }, words.keep);
  const draftButton = h("button", { type: "button", class: "bw-button be-draft", onclick: () => submit("draft") }, words.keep_draft);
  const overButton = h("button", { type: "button", class: "bw-button be-over", onclick: () => { forget(); reopen(); } }, words.start_over);
  const side = h("aside", { class: "be-side" }, h("h3", {}, words.checks), verdict, others, h("div", { class: "be-row be-buttons" }, keepButton, draftButton, overButton),
    h("h3", {}, words.effect), effectWords, effectTable, h("h3", {}, words.would_change), changes, picture);
  const node = h("div", { class: "be-split" }, h("div", { class: "be-form" }, h("div", { class: "be-row" }, kindGroup), h("div", { class: "be-row" }, recordPicker.node, fresh),
    actionRow, keyRow, place, reasonRow), side);

  const fieldEnv = {
    words, send, catalogue: env.catalogue, crosshair: env.crosshair, slices: env.slices,
    starts: () => Object.fromEntries((env.fields().depends || []).map((field) => [field.name, field.start])),
    ends: () => ["from", "to"].map((name) => middleOf(value(name))).filter(Boolean),
  };
  const nameOf = (kindsOf, key) => {
    for (const kind of kindsOf) {
      const found = (env.catalogue()[kind] || []).find(([each]) => each === key);
      if (found) return found[1];
    }
    return key;
  };
  const middleOf = (reference) => {
    const [key, side_] = String(reference || "").split("@");
    const found = (env.catalogue().region || []).find(([each]) => each === key);
    if (!found) return null;
    const [x, y, z] = found[2];
    return side_ === "other" || side_ === "right" ? [-x, y, z] : [x, y, z];
  };
  const value = (name) => now.fields.get(name)?.get();

  function openNew(kind) {
    wanted = kind;
    kindGroup.show(kind);
    recordPicker.set("");
    ask(kind, "");
  }
  function openRecord(kind, key) {
    wanted = kind;
    kindGroup.show(kind);
    recordPicker.set(key);
    ask(kind, key);
  }
  function ask(kind, key) {
    if (now) kept.set(`${now.of}/${now.opened}`, { body: body(true), reason: reason.value, key: keyInput.value, keyTouched: now.keyTouched, pathway: pathwayPicker.get(), touched: [...now.touched] });
    n += 1;
    send({ kind: "open", of: kind, key, n });
  }
  const forget = () => now && kept.delete(`${now.of}/${now.opened}`);
  function reopen() {
    const { of, opened } = now;
    now = null;
    ask(of, opened);
  }

  function opened(form) {
    if (form.of === undefined || form.n !== n) return;
    if (now) for (const field of now.fields.values()) if (field.stop) field.stop();
    const fields = new Map((env.fields()[form.of] || []).map((field) => [field.name, makeField(field, form.of, fieldEnv, touched)]));
    const memory = kept.get(`${form.of}/${form.key}`);
    now = { of: form.of, opened: form.key, action: form.action, base: form.block, fields, keyTouched: false, touched: new Set(memory?.touched || []) };
    place.replaceChildren(...[...fields.values()].map((field) => field.node));
    const values = { ...form.block, ...(memory ? memory.body : {}) };
    for (const [name, field] of fields) field.set(values[name]);
    keyInput.value = memory ? memory.key : "";
    now.keyTouched = memory ? memory.keyTouched : false;
    pathwayPicker.set(memory ? memory.pathway : "");
    reason.value = memory ? memory.reason : "";
    suggest();
    show();
    actions.show("change");
    sketch();
    later();
  }

  function body(whole = false) {
    const told = {};
    for (const [name, field] of now.fields) {
      const got = field.get();
      const before = now.base[name];
      if (whole) told[name] = got;
      else if (now.action === "add") {
        if (got !== null && got !== undefined) told[name] = got;
      } else if (now.action === "change" && !same(got ?? null, before ?? null)) told[name] = got;
      else if (now.action === "dispute" && name === "sources") told.sources = [];
    }
    if (now.action === "dispute" && !whole) return {};
    return told;
  }
  const key = () => {
    if (now.action !== "add") return now.opened;
    return now.of === "segment" && pathwayPicker.get() ? `${pathwayPicker.get()}.${keyInput.value}` : keyInput.value;
  };

  /** Words that follow from the other fields, until somebody writes their own. */
  function suggest() {
    if (!now || now.action !== "add") return;
    const put = (name, text) => {
      if (!now.touched.has(name) && now.fields.has(name) && now.fields.get(name).get() !== text) now.fields.get(name).set(text);
    };
    if (now.of === "segment" && value("from") && value("to")) {
      put("name", fill(words.segment_name, { from: nameOf(["region"], value("from").split("@")[0]), to: nameOf(["region"], value("to").split("@")[0]) }));
      const ends = fieldEnv.ends();
      if (!now.touched.has("waypoints_mni") && ends.length === 2) put("waypoints_mni", ends);
    }
    if (now.of === "claim" && value("subject") && value("object")) {
      const [subject, object] = [nameOf(["segment", "region", "pathway", "function"], value("subject")), nameOf(["function", "sign", "region", "segment", "pathway"], value("object"))];
      put("says", fill(words[`says_${value("relation")}`] || "{subject} {object}", { subject, object }));
    }
    if (!now.keyTouched) {
      const last = (reference) => String(reference || "").split("@")[0].split(".").pop();
      const stem = now.of === "claim" ? [last(value("subject")), value("relation"), last(value("object"))].filter(Boolean).join(" ")
        : now.of === "segment" && !now.touched.has("name") && value("from") && value("to") ? `${last(value("from"))} to ${last(value("to"))}`
        : now.of === "source" ? `${String(value("authors") || "").split(/[\s,]/)[0]} ${value("year") || ""}` : String(value("name") || "");
      const taken = new Set((env.catalogue()[now.of] || []).map(([each]) => each));
      const lead = now.of === "segment" ? `${pathwayPicker.get()}.` : "";
      const made = slug(stem);
      let free = made;
      for (let i = 2; made && taken.has(lead + free); i += 1) free = `${made}_${i}`;
      keyInput.value = free;
    }
  }

  function touched(name, done = true) {
    if (!now) return;
    now.touched.add(name);
    suggest();
    if (["waypoints_mni", "from", "to", "radius_mm", "fit", "sides"].includes(name)) sketch(done);
    later();
  }

  // -- the live course
  let sketching = null;
  let asking = false;
  function sketch(done = true) {
    if (!now || now.of !== "segment") return;
    const points = value("waypoints_mni");
    const field = now.fields.get("waypoints_mni");
    if (points.length < 2) {
      field.course(null, "");
      return;
    }
    sketching = { kind: "sketch", n: (n += 1), lines: done ? 40 : 0,
      body: { waypoints_mni: points, from: value("from"), to: value("to"), radius_mm: value("radius_mm") || 3, fit: value("fit") || "fits", sides: value("sides") || "paired" } };
    if (!asking) next();
  }
  function next() {
    if (!sketching) return;
    asking = true;
    send(sketching);
    sketching = null;
  }
  function sketched(message, arrays) {
    asking = false;
    if (now && now.of === "segment") {
      const field = now.fields.get("waypoints_mni");
      if (message.fault) field.course(null, message.fault);
      else {
        const line = arrays.line.data;
        let length = 0;
        for (let i = 3; i < line.length; i += 3) length += Math.hypot(line[i] - line[i - 3], line[i + 1] - line[i - 2], line[i + 2] - line[i - 1]);
        field.course({ line, points: arrays.points.data, offsets: arrays.offsets.data }, fill(words.course_line, { mm: Math.round(length) }));
      }
    }
    next();
  }

  // -- checks
  function later() {
    clearTimeout(timer);
    if (!now) return;
    const empty = now.action === "add" ? now.touched.size === 0 : now.action === "change" && Object.keys(body()).length === 0;
    n += 1;
    if (empty) {
      judged({ n, usable: null, faults: [], changes: [], picture: {} });
      effected({ n, stage: "none", words: "", rows: [] });
      return;
    }
    say(verdict, words.checking);
    mark(node, "data-state", "checking");
    timer = setTimeout(() => send({ kind: "try", n, of: now.of, key: key(), action: now.action, body: body(), reason: reason.value }), REST_MS);
  }
  function judged(trial) {
    if (!now || trial.n !== n) return;
    const by = new Map();
    for (const fault of trial.faults) by.set(fault.field, [...(by.get(fault.field) || []), fault]);
    for (const [name, field] of now.fields) field.showFaults(by.get(name) || []);
    const list = (target, faults) => keep(target, faults, (fault) => fault.text, (fault) => h("li", { class: fault.grave ? "be-grave" : "be-mild" }, fault.text));
    list(keyFaults, by.get("key") || []);
    list(reasonFaults, by.get("reason") || []);
    list(others, [...by].filter(([name]) => name === "" || !(now.fields.has(name) || name === "key" || name === "reason")).flatMap(([, faults]) => faults));
    const grave = trial.faults.some((fault) => fault.grave);
    say(verdict, trial.usable === null ? words.no_change : !trial.usable ? words.not_usable : trial.faults.length ? words.incomplete : words.usable);
    mark(verdict, "data-state", trial.usable === null ? "none" : trial.usable ? (trial.faults.length ? "mild" : "good") : "grave");
    mark(node, "data-state", trial.usable === null ? "none" : trial.usable ? "usable" : "broken");
    keepButton.disabled = !trial.usable;
    draftButton.disabled = trial.usable === null;
    draftButton.hidden = !(grave || now.action !== "retire");
    keep(changes, trial.changes, (change) => change.words, (change) => h("li", {}, change.words));
    picture.replaceChildren(...(trial.picture.nodes && trial.picture.nodes.length ? [drawPicture(trial.picture, words)] : []));
  }
  function effected(effect) {
    if (!now || effect.n !== n) return;
    mark(effectTable, "data-stage", effect.stage);
    say(effectWords, effect.stage === "waits" ? words.effect_waits : effect.stage === "none" ? effect.words || words.effect_none : effect.words);
    effectTable.hidden = effect.stage !== "done";
    const most = Math.max(0.01, ...effect.rows.flatMap((row) => [row.before || 0, row.after || 0]));
    keep(effectRows, effect.rows, (row) => row.account, () => h("tr", {}, h("th", { scope: "row" }, h("span", { class: "be-title" })), h("td", {}), h("td", {})), (row, item) => {
      say(row.cells[0].firstChild, item.title);
      mark(row.cells[0], "title", item.title);
      for (const [cell, amount] of [[row.cells[1], item.before], [row.cells[2], item.after]]) {
        cell.replaceChildren(h("span", { class: "be-bar", style: `--share: ${(amount || 0) / most}` }), h("span", { class: "bw-number" }, amount === null ? words.not_shown : percent(amount)));
      }
      row.classList.toggle("be-moved", Math.abs(item.change) >= 0.005);
      mark(row, "title", `${item.change >= 0 ? "+" : ""}${fixed(item.change * 100, 1)} %`);
    });
  }
  function submit(kind) {
    send({ kind, n, of: now.of, key: key(), action: now.action, body: body(), reason: reason.value });
  }
  function done(message) {
    if (message.of) {
      forget();
      const { of } = now;
      now = null;
      openNew(of);
    }
  }
  function show() {
    const add = now.action === "add";
    keyRow.hidden = !add;
    pathwayPicker.node.hidden = now.of !== "segment";
    actionRow.hidden = add;
    place.hidden = now.action === "retire" || now.action === "dispute";
    reasonRow.hidden = add;
  }
  return {
    node, opened, judged, effected, sketched, done, openRecord,
    start: () => openNew(wanted),
    reopen: () => now && reopen(),
    setSlices: (slices) => now?.fields.get("waypoints_mni")?.box.setSlices(slices),
    stop: () => now && [...now.fields.values()].forEach((field) => field.stop && field.stop()),
  };
}
