// The heading and the choices of the 3-D head; the picture itself is plotly's.
import { frame, freshId, glyph, h, keep, mark, number, percent, setNumber, watch } from "../front/kit.js";

function check(name, words, model, part) {
  const id = freshId(part);
  const box = h("input", { type: "checkbox", id, onchange: () => {
    model.set("parts", { ...model.get("parts"), [part]: box.checked });
    model.save_changes();
  } });
  return Object.assign(h("span", { class: "bw-check" }, box, h("label", { for: id }, h("i", { class: `bw-swatch bw-swatch-${part}` }), words[part])), { box, part });
}

function render({ model, el }) {
  const words = model.get("words");
  const checks = ["brain", "lesion", "cut", "spared"].map((part) => check(part, words, model, part));
  const { panel, body, foot } = frame(el, words, "head3d", ...checks);
  const list = h("div", { class: "bw-head-chips", role: "group", "aria-label": words.segments_shown });
  body.append(list);
  foot.append(h("p", {}, words.hint));

  function make(item) {
    const share = number();
    const button = h("button", { type: "button", class: "bw-chip", "data-element": item.id, onclick: () => {
      const shown = new Set(model.get("shown"));
      if (shown.has(item.id)) shown.delete(item.id);
      else shown.add(item.id);
      model.set("shown", [...shown]);
      model.save_changes();
      draw();
    } }, glyph(item.kind), h("span", {}, item.name), h("span", { class: "bw-side" }, words[`${item.side}_short`]), share);
    button.change = (now) => {
      setNumber(share, `damage/${now.id}/share`, now.share, percent(now.share));
      mark(button, "aria-pressed", model.get("shown").includes(now.id) ? "true" : "false");
    };
    return button;
  }

  function draw() {
    for (const { box, part } of checks) box.checked = Boolean(model.get("parts")[part]);
    keep(list, model.get("choices"), (item) => item.id, make, (node, item) => node.change(item));
    mark(panel, "data-stamp", model.get("stamp"));
  }

  // The picture fits itself to its place only when the window says that it was resized.
  const fit = () => window.dispatchEvent(new Event("resize"));
  const sized = new ResizeObserver(fit);
  sized.observe(panel);
  const later = [400, 1500, 4000].map((ms) => setTimeout(fit, ms));
  const stop = watch(model, ["choices", "shown", "parts", "stamp"], draw);
  return () => {
    sized.disconnect();
    later.forEach(clearTimeout);
    stop();
  };
}

export default { render };
