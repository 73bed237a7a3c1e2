// The tool rail, and the row above the films with the options of the tool that is out.
import { h, mark, say } from "../front/kit.js";
import { icon } from "./icons.js";
import { keyName } from "./commands.js";
import { TOOLS } from "./hand.js";

/** A button for a command; its title names the keys. */
export function commandButton(view, id, content, more) {
  const command = view.commands.find((c) => c.id === id);
  const { words } = view;
  const button = h("button", { type: "button", class: "bs-button", title: `${words[id]} (${keyName(command.keys[0], words)})`,
    "aria-label": words[id], "aria-keyshortcuts": command.keys[0].replace("mod", "Control"), onclick: () => command.run(),
    ...more }, content);
  button.refresh = () => {
    if (command.on) mark(button, "aria-pressed", command.on() ? "true" : "false");
    if (command.can) button.disabled = !command.can();
  };
  return button;
}

export function rail(view) {
  const buttons = TOOLS.map((tool) => commandButton(view, `tool_${tool}`, [icon(tool),
    h("span", {}, view.words[`tool_${tool}_short`])], { class: "bs-button bs-tool", "data-tool": tool }));
  const node = h("div", { class: "bs-rail", role: "toolbar", "aria-orientation": "vertical", "aria-label": view.words.tools },
    buttons);
  node.addEventListener("keydown", (event) => {
    const step = { ArrowDown: 1, ArrowUp: -1, ArrowRight: 1, ArrowLeft: -1 }[event.key];
    const at = buttons.indexOf(event.target);
    if (!step || at < 0) return;
    event.preventDefault();
    event.stopPropagation();
    buttons[(at + step + buttons.length) % buttons.length].focus();
  });
  node.refresh = () => buttons.forEach((button) => {
    button.refresh();
    mark(button, "tabindex", button.getAttribute("aria-pressed") === "true" ? "0" : "-1");
  });
  return node;
}

/** A labelled slider with its value behind it. `shown(value)` words the value. */
export function slider(label, range, value, shown, change) {
  const output = h("output", { class: "bs-value" }, shown(value));
  const input = h("input", { type: "range", min: range[0], max: range[1], step: range[2], value, "aria-label": label });
  mark(input, "aria-valuetext", shown(value));
  const told = (last) => {
    say(output, shown(Number(input.value)));
    mark(input, "aria-valuetext", output.textContent);
    change(Number(input.value), last);
  };
  input.addEventListener("input", () => told(false));
  input.addEventListener("change", () => told(true));
  const node = h("label", { class: "bs-slider" }, h("span", {}, label), input, output);
  node.show = (next) => {
    if (node.contains(document.activeElement) && document.activeElement === input && Number(input.value) === next) return;
    input.value = next;
    say(output, shown(next));
    mark(input, "aria-valuetext", output.textContent);
  };
  return node;
}

/** A switch: a checkbox with its label. */
export function toggle(label, get, set, title) {
  const input = h("input", { type: "checkbox", onchange: () => set(input.checked) });
  const node = h("label", { class: "bs-toggle", title }, input, h("span", {}, label));
  node.refresh = () => {
    input.checked = get();
  };
  node.refresh();
  return node;
}

const mm = (value) => `${value} mm`;

/** The options of each tool, built once and shown in turn. */
export function optionsRow(view) {
  const { look, words } = view;
  const radius = slider(words.radius, [0.5, 30, 0.5], look.radius, mm, (value) => look.set({ radius: value }));
  const ball = toggle(words.ball, () => look.ball, (on) => look.set({ ball: on }), words.ball_more);
  const spare = toggle(words.spare, () => look.spare, (on) => look.set({ spare: on }), words.spare_more);
  const own = toggle(words.own_only, () => look.ownOnly, (on) => look.set({ ownOnly: on }), words.own_only_more);
  const cut = toggle(words.cut_shape, () => look.cutShape, (on) => look.set({ cutShape: on }), words.cut_shape_more);
  const sphere = toggle(words.sphere, () => look.sphere, (on) => look.set({ sphere: on }), words.sphere_more);
  const all = toggle(words.move_all, () => look.moveAll, (on) => look.set({ moveAll: on }));
  const percent = (value) => `± ${Math.round(value * 100)} %`;
  const tolerance = slider(words.tolerance, [0.01, 0.4, 0.01], look.tolerance, percent, (v) => look.set({ tolerance: v }));
  const reach = slider(words.reach, [3, 80, 1], look.reach, mm, (value) => look.set({ reach: value }));
  const lay = h("button", { type: "button", class: "bs-button bs-strong", onclick: () => view.finish() }, words.lay);
  const hint = h("span", { class: "bs-option-text" });
  const own_text = h("span", {});
  const sets = {
    look: [hint], brush: [radius, ball, spare], eraser: [radius, ball, own], polygon: [hint, spare, cut],
    spread: [tolerance, reach, spare], drop: [own_text, sphere, spare, cut, lay], move: [own_text, all, lay], ruler: [hint],
  };
  const node = h("div", { class: "bs-options", role: "group", "aria-label": words.options });
  let shown = "";
  node.refresh = () => {
    if (shown !== look.tool) {
      shown = look.tool;
      node.replaceChildren(...sets[look.tool]);
    }
    radius.show(look.radius);
    reach.show(look.reach);
    tolerance.show(look.tolerance);
    [ball, spare, own, cut, sphere, all].forEach((item) => item.refresh());
    say(hint, words[`hint_${look.tool}`]);
    const { tool } = view.hand;
    if (tool.options) own_text.replaceChildren(tool.options(words));
    lay.disabled = !(tool.centre || tool.box);
  };
  return node;
}
