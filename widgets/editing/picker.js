// A field that finds one thing in a long list: write to narrow it down, arrows and Enter or a click to choose.
import { fill, freshId, h, mark } from "../front/kit.js";

const MOST = 150;

/**
 * `options()` returns [[key, name], ...]; `pick(key)` is called on a choice. With `free`, what is written may stand as
 * it is; with `clear`, the field empties itself after a choice.
 */
export function makePicker(words, label, options, pick, { free = false, clear = false, placeholder = "" } = {}) {
  const id = freshId("pick");
  const input = h("input", { type: "text", class: "bw-search be-pick-input", role: "combobox", "aria-label": label, "aria-expanded": "false",
    "aria-controls": id, "aria-autocomplete": "list", autocomplete: "off", spellcheck: "false", placeholder: placeholder || words.find });
  const list = h("ul", { id, class: "be-pick-list", role: "listbox", "aria-label": label, hidden: true });
  const node = h("div", { class: "be-pick" }, input, list);
  let value = "";
  let shown = [];
  let at = -1;
  let most = MOST;

  const nameOf = (key) => (options().find(([each]) => each === key) || [key, key])[1];

  function close() {
    most = MOST;
    list.hidden = true;
    mark(input, "aria-expanded", "false");
    mark(input, "aria-activedescendant", null);
  }
  function point(next) {
    at = next;
    [...list.querySelectorAll("[role=option]")].forEach((item, n) => mark(item, "aria-selected", n === at ? "true" : "false"));
    const item = list.querySelectorAll("[role=option]")[at];
    mark(input, "aria-activedescendant", item ? item.id : null);
    if (item) item.scrollIntoView({ block: "nearest" });
  }
  function open(text) {
    const wanted = text.toLowerCase().split(/\s+/).filter(Boolean);
    const rank = ([key, name]) => (name.toLowerCase().startsWith(text.toLowerCase()) || key.startsWith(text) ? 0 : 1);
    const found = options().filter(([key, name]) => wanted.every((part) => `${name} ${key}`.toLowerCase().includes(part)));
    if (wanted.length) found.sort((a, b) => rank(a) - rank(b));
    shown = found.slice(0, most);
    list.replaceChildren(...shown.map(([key, name], n) => {
      const item = h("li", { id: `${id}-${n}`, role: "option", "aria-selected": "false", "data-key": key, class: "be-pick-item" }, name,
        name === key || key === "" ? null : h("span", { class: "bw-soft" }, ` ${key}`));
      item.addEventListener("pointerdown", (event) => {
        event.preventDefault();
        choose(key);
      });
      return item;
    }));
    if (found.length > most) {
      list.append(h("li", { class: "bw-soft be-pick-more", onpointerdown: (event) => {
        event.preventDefault();
        const { scrollTop } = list;
        most += MOST;
        open(text);
        list.scrollTop = scrollTop;
      } }, fill(words.more_match, { count: found.length - most })));
    } else if (!found.length) list.append(h("li", { class: "bw-soft be-pick-more" }, words.nothing_matches));
    list.hidden = false;
    mark(input, "aria-expanded", "true");
    point(wanted.length && shown.length ? 0 : -1);
  }
  function choose(key) {
    close();
    value = clear ? "" : key;
    input.value = clear ? "" : nameOf(key);
    pick(key);
  }
  input.addEventListener("focus", () => input.select());
  input.addEventListener("pointerdown", () => (list.hidden ? open("") : close()));
  input.addEventListener("input", () => open(input.value));
  input.addEventListener("blur", () => {
    close();
    if (free && input.value !== nameOf(value)) {
      value = input.value.trim();
      pick(value);
    } else if (!clear) input.value = value ? nameOf(value) : "";
  });
  input.addEventListener("keydown", (event) => {
    const count = shown.length;
    if (event.key === "ArrowDown" || event.key === "ArrowUp") {
      event.preventDefault();
      if (list.hidden) open(value && input.value === nameOf(value) ? "" : input.value);
      else if (count) point((at + (event.key === "ArrowDown" ? 1 : -1) + count) % count);
    } else if (event.key === "Enter" && !list.hidden && at >= 0) {
      event.preventDefault();
      choose(shown[at][0]);
    } else if (event.key === "Escape" && !list.hidden) {
      event.preventDefault();
      close();
    }
  });
  return {
    node, input,
    get: () => value,
    set: (key) => {
      value = key || "";
      if (input.getRootNode().activeElement !== input) input.value = value ? nameOf(value) : "";
    },
  };
}
