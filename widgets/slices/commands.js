// Every command, once: what it does, its keys, and where it stands. Buttons, keyboard and the help list read from here.
// A key is written as in KeyboardEvent.key; "mod" is Ctrl or Command.

const TOOL_KEYS = { look: "v", brush: "b", eraser: "e", polygon: "g", spread: "w", drop: "d", move: "m", ruler: "r" };

export function commandsOf(view) {
  const { look } = view;
  const list = Object.entries(TOOL_KEYS).map(([tool, key]) => ({
    id: `tool_${tool}`, group: "tools", keys: [key], run: () => view.takeTool(tool), on: () => look.tool === tool,
  }));
  const add = (group, id, keys, run, more) => list.push({ group, id, keys, run, ...more });
  add("drawing", "undo", ["mod+z"], () => view.command({ op: "undo" }), { can: () => view.store.steps[0] > 0 });
  add("drawing", "redo", ["mod+shift+z", "mod+y"], () => view.command({ op: "redo" }),
    { can: () => view.store.steps[1] > 0 });
  add("drawing", "act", ["Enter"], () => view.actAtCursor());
  add("drawing", "finish", ["shift+Enter"], () => view.finish());
  add("drawing", "cancel", ["Escape"], () => view.hand.cancel());
  add("drawing", "smaller", ["["], () => look.set({ radius: Math.max(0.5, look.radius - (look.radius > 4 ? 1 : 0.5)) }));
  add("drawing", "larger", ["]"], () => look.set({ radius: Math.min(40, look.radius + (look.radius >= 4 ? 1 : 0.5)) }));
  add("drawing", "ball", ["3"], () => look.set({ ball: !look.ball }), { on: () => look.ball });
  add("drawing", "next_compartment", ["n"], () =>
    look.set({ compartment: (look.compartment + 1) % Math.max(1, view.store.styles.length) }));
  add("drawing", "fill_between", ["i"], () => view.fillBetween());
  add("drawing", "grow", ["mod+ArrowUp"], () => view.resize(1));
  add("drawing", "shrink", ["mod+ArrowDown"], () => view.resize(-1));
  add("drawing", "save", ["mod+s"], () => view.store.send("save"));
  for (const [id, key, axis, by] of [["left", "ArrowLeft", 0, -1], ["right", "ArrowRight", 0, 1], ["up", "ArrowUp", 1, 1],
    ["down", "ArrowDown", 1, -1]]) {
    add("looking", `cursor_${id}`, [key, `shift+${key}`], (shift) => view.nudge(axis, by * (shift ? 5 : 1)));
  }
  add("looking", "slice_up", ["PageUp", ".", "shift+PageUp"], (shift) => view.stepSlice(null, shift ? 5 : 1));
  add("looking", "slice_down", ["PageDown", ",", "shift+PageDown"], (shift) => view.stepSlice(null, shift ? -5 : -1));
  add("looking", "zoom_in", ["+", "="], () => view.zoom(1.25));
  add("looking", "zoom_out", ["-"], () => view.zoom(0.8));
  add("looking", "fit", ["0"], () => view.fitAll());
  add("looking", "to_lesion", ["c"], () => view.goToLesion());
  add("looking", "enlarge_next", ["f"], () => look.set({ focus: [2, 1, 0][([2, 1, 0].indexOf(look.focus) + 1) % 3] }));
  add("looking", "crosshair", ["x"], () => look.set({ crosshair: !look.crosshair }), { on: () => look.crosshair });
  add("looking", "hide_drawing", ["h"], () => look.set({ strength: look.strength > 0 ? 0 : 1 }));
  add("looking", "radiological", ["o"], () => view.setRadiological(!view.radiological), { on: () => view.radiological });
  add("looking", "next_scan", ["t"], () => view.nextScan());
  add("looking", "contrast", ["k"], () => look.set({ contrast: !look.contrast }), { on: () => look.contrast });
  add("looking", "help", ["?"], () => view.toggleHelp());
  return list;
}

/** The command that a key event asks for, as [command, shift], or null. */
export function commandFor(list, event) {
  const mod = event.ctrlKey || event.metaKey;
  const named = event.key.length > 1;
  const plain = named ? event.key : event.key.toLowerCase();
  const forms = [];
  if (mod) forms.push(event.shiftKey ? `mod+shift+${plain}` : `mod+${plain}`);
  else {
    if (event.shiftKey && named) forms.push(`shift+${plain}`);
    else forms.push(event.key, plain);
  }
  if (event.altKey) return null;
  for (const command of list) {
    if (command.keys.some((key) => forms.includes(key))) return [command, event.shiftKey];
  }
  return null;
}

/** A key as people read it. */
export function keyName(key, words) {
  const names = { mod: words.key_ctrl, shift: words.key_shift, ArrowLeft: "←", ArrowRight: "→", ArrowUp: "↑", ArrowDown: "↓",
    PageUp: words.key_page_up, PageDown: words.key_page_down, Enter: words.key_enter, Escape: words.key_escape };
  const parts = key === "+" ? ["+"] : key.split("+");
  return parts.map((part) => names[part] || (part.length === 1 ? part.toUpperCase() : part)).join(" ");
}
