// A row of tabs; the kernel shows the panel that is chosen.
import { guardKeys, h, segmented, watch } from "./kit.js";

function render({ model, el }) {
  const words = model.get("words");
  const tabs = segmented(words.more, model.get("names").map((name) => [name, words[`tab_${name}`]]), model.get("shown"), (name) => {
    model.set("shown", name);
    model.save_changes();
  });
  const panel = h("nav", { class: "byway-panel byway-tabs", "aria-label": words.more }, tabs);
  guardKeys(panel);
  el.append(panel);
  return watch(model, ["shown"], () => tabs.show(model.get("shown")));
}

export default { render };
