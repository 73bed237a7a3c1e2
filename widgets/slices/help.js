// The list of all commands with their keys.
import { freshId, h } from "../front/kit.js";
import { keyName } from "./commands.js";

export function helpSheet(view) {
  const { words, commands } = view;
  const id = freshId("help");
  const groups = ["tools", "drawing", "looking"].map((group) => h("section", {}, h("h3", {}, words[`group_${group}`]),
    h("dl", {}, commands.filter((c) => c.group === group).map((c) => h("div", {}, h("dt", {},
      c.keys.filter((key) => !key.startsWith("shift+Page") && !key.startsWith("shift+Arrow")).map((key) =>
        h("kbd", {}, keyName(key, words)))), h("dd", {}, words[c.id]))))));
  const close = h("button", { type: "button", class: "bs-button", onclick: () => view.toggleHelp() }, words.close);
  const node = h("div", { class: "bs-help", role: "dialog", "aria-modal": "false", "aria-labelledby": id, hidden: true,
    tabindex: "-1" }, h("header", {}, h("h2", { id }, words.help), close), h("div", { class: "bs-help-groups" }, groups),
    h("p", { class: "bw-soft" }, words.help_pointer));
  return node;
}
