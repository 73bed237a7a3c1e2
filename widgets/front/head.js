// The strip above the panels: which case, what is known of the person, the caution, and the last remark.
import { fill, freshId, guardKeys, h, mark, say, watch } from "./kit.js";

function field(name, words, options, change) {
  const id = freshId(name);
  const select = h("select", { id, onchange: () => change(name, select.value) },
    options.map((value) => h("option", { value }, words[`${name}_${value}`] || value)));
  /** Choose a value; one that a file gives and the list does not hold is offered too. */
  function offer(value) {
    if (value && !options.includes(value) && select.lastChild.value !== value) select.append(h("option", { value }, value));
    select.value = value;
  }
  return Object.assign(h("div", { class: "bw-field" }, h("label", { for: id, class: "bw-soft" }, words[name]), select), { select, offer });
}

function render({ model, el }) {
  const words = model.get("words");
  const change = (name, value) => model.send({ kind: "case", name, value });
  const title = h("input", { class: "bw-case-input", type: "text", maxlength: 200, "aria-label": words.case_title, title: words.case_title,
    placeholder: words.untitled, onchange: () => change("title", title.value.trim()) });
  const invented = h("span", { class: "bw-tag" }, words.invented);
  const fields = Object.entries(model.get("options")).map(([name, options]) => field(name, words, options, change));
  const whose = h("p", { class: "bw-head-caution bw-soft" });
  const notice = h("p", { class: "bw-notice", role: "status" });
  const save = h("button", { type: "button", class: "bw-button", onclick: () => model.send({ kind: "save" }) }, words.save);
  const panel = h("header", { class: "byway-panel byway-head", "aria-label": words.title },
    h("div", { class: "bw-head-line" }, h("h1", { class: "bw-case" }, title), invented, h("div", { class: "bw-head-fields" }, fields, save)),
    notice, h("p", { class: "bw-head-caution bw-soft" }, words.caution), whose);
  guardKeys(panel);
  el.append(panel);

  function draw() {
    const told = model.get("told");
    if (title.getRootNode().activeElement !== title) title.value = told.title || "";
    mark(title, "size", Math.min(90, Math.max(24, (told.title || "").length)));
    mark(title, "title", told.title ? `${told.title}\n${words.case_title}` : words.case_title);
    title.disabled = !told.open;
    invented.hidden = !told.invented;
    for (const [i, name] of Object.keys(model.get("options")).entries()) {
      fields[i].offer(told[name]);
      fields[i].select.disabled = !told.open;
    }
    save.hidden = !told.folder;
    say(whose, told.whose ? fill(words.whose, { whose: told.whose }) : "");
    const text = model.get("notice");
    say(notice, text);
    notice.hidden = !text;
    mark(panel, "data-stamp", model.get("stamp"));
  }

  return watch(model, ["told", "notice", "stamp"], draw);
}

export default { render };
