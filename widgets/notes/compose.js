// Writing: text, what it is about, tags. One form for new notes, answers and edits.
import { fill, freshId, h, say } from "../front/kit.js";

function field(label, node) {
  const id = freshId("note");
  node.id = id;
  return h("div", { class: "bw-note-field" }, h("label", { for: id, class: "bw-soft" }, label), node);
}

/**
 * A form. `send(fields)` is called with text, tags and anchor; `about` is false where a note inherits what it is about
 * (an answer, an edit). `form.change(here, places)` offers what can be pointed at now.
 */
export function makeForm(words, send, { about = true, start = {}, put = words.put, cancel = null } = {}) {
  const text = h("textarea", { class: "bw-note-text", rows: 3, placeholder: words.text_hint });
  text.value = start.text || "";
  const tags = h("input", { class: "bw-search", type: "text", placeholder: words.tags_hint });
  tags.value = (start.tags || []).join(", ");
  const anchor = h("select", {}, [["case", words.about_case], ["voxel", ""], ["selected", ""], ["other", words.about_other]]
    .map(([value, label]) => h("option", { value }, label)));
  const listId = freshId("places");
  const list = h("datalist", { id: listId });
  const find = h("input", { class: "bw-search bw-note-find", type: "search", list: listId, placeholder: words.about_find, "aria-label": words.about_find });
  find.hidden = true;
  anchor.addEventListener("change", () => { find.hidden = anchor.value !== "other"; });
  let here = { mm: [0, 0, 0], key: "", kind: "region", label: "" };
  let places = [];

  function pointed() {
    if (anchor.value === "voxel") return { kind: "voxel", mm: here.mm };
    if (anchor.value === "selected" && here.key) return { kind: here.kind, key: here.key };
    if (anchor.value === "other") {
      const wanted = find.value.trim().toLowerCase();
      const hit = wanted && (places.find((place) => place[2].toLowerCase() === wanted || place[1] === wanted)
        || places.find((place) => place[2].toLowerCase().includes(wanted)));
      if (hit) return { kind: hit[0], key: hit[1] };
    }
    return { kind: "case" };
  }

  const form = h("form", { class: "bw-note-form" }, field(words.write, text),
    h("div", { class: "bw-note-line" }, about ? [field(words.anchor, anchor), find, list] : null, field(words.tags, tags),
      h("div", { class: "bw-note-acts" }, cancel ? h("button", { type: "button", class: "bw-button", onclick: cancel }, words.cancel) : null,
        h("button", { type: "submit", class: "bw-button bw-primary" }, put))));
  form.addEventListener("submit", (event) => {
    event.preventDefault();
    if (!text.value.trim()) {
      text.focus();
      return;
    }
    send({ text: text.value, tags: tags.value.split(","), ...(about ? { anchor: pointed() } : {}) });
  });
  form.clear = () => {
    text.value = "";
    tags.value = "";
  };
  form.change = (now, all) => {
    here = now;
    say(anchor.options[1], fill(words.about_voxel, { place: `(${now.mm.map((v) => Math.round(v)).join(", ")})` }));
    anchor.options[2].hidden = !now.key;
    say(anchor.options[2], fill(words.about_selected, { label: now.label || now.key }));
    if (!now.key && anchor.value === "selected") anchor.value = "case";
    if (all !== places) {
      places = all;
      list.replaceChildren(...all.map((place) => h("option", { value: place[2] })));
    }
  };
  form.focus = () => text.focus();
  return form;
}
