// The slices panel: one store a model, one view a cell.
import { frame, freshId, h, mark, say } from "../front/kit.js";
import { WithActions } from "./actions.js";
import { backgrounds } from "./backgrounds.js";
import { commandButton, optionsRow, rail } from "./controls.js";
import { commandsOf } from "./commands.js";
import { PLANES } from "./geometry.js";
import { Hand } from "./hand.js";
import { helpSheet } from "./help.js";
import { icon } from "./icons.js";
import { compartments, shapeTools } from "./inspector.js";
import { Layers } from "./layers.js";
import { LookState } from "./look.js";
import { overlays } from "./overlays.js";
import { Film } from "./plane.js";
import { Projection } from "./projection.js";
import { readout } from "./readout.js";
import { Store } from "./store.js";

class View extends WithActions {
  constructor(model, store, el) {
    super();
    this.model = model;
    this.store = store;
    this.words = model.get("words");
    this.listId = freshId("elements");
    this.ends = new AbortController();
    this.cursor = [98, 134, 72];
    this.look = new LookState(store, (keys) => this.lookChanged(keys));
    this.layers = new Layers(store, this.look);
    this.hand = new Hand(this);
    this.commands = commandsOf(this);
    this.build(el);
    this.listen();
    this.started();
  }

  get radiological() {
    return this.model.get("radiological");
  }

  build(el) {
    const { words } = this;
    this.films = PLANES.map((plane) => new Film(plane, this));
    this.projection = new Projection(this);
    this.displayWord = h("span", {});
    this.display = h("button", { type: "button", class: "bs-button", onclick: () => this.setRadiological(!this.radiological) },
      h("span", { class: "bs-wide" }, words.display, " "), this.displayWord);
    this.buttons = [commandButton(this, "undo", icon("undo")), commandButton(this, "redo", icon("redo"))];
    const helpButton = commandButton(this, "help", icon("help"));
    const { panel, body, foot } = frame(el, words, "slices", ...this.buttons, this.display,
      h("button", { type: "button", class: "bs-button", onclick: () => this.store.send("save") }, words.save_short), helpButton);
    this.panel = panel;
    this.rail = rail(this);
    this.options = optionsRow(this);
    this.stage = h("div", { class: "bs-stage" }, ...this.films.map((film) => film.node), this.projection.node);
    this.readout = readout(this);
    this.side = [compartments(this), shapeTools(this), backgrounds(this), overlays(this)];
    this.help = helpSheet(this);
    this.status = h("p", { class: "bs-status", role: "status" });
    this.live = h("p", { class: "bw-hidden-text", "aria-live": "polite" });
    body.append(h("div", { class: "bs-table" }, this.rail, h("div", { class: "bs-middle" }, this.options, this.stage,
      this.readout), h("div", { class: "bs-side", role: "group", "aria-label": words.inspector }, ...this.side)), this.help,
    this.live);
    foot.append(this.status);
  }

  listen() {
    const { signal } = this.ends;
    for (const film of this.films) this.hand.attend(film, signal);
    this.panel.addEventListener("keydown", (event) => this.key(event), { signal });
    this.panel.addEventListener("keyup", (event) => {
      if (event.key === " ") this.spaceDown = false;
    }, { signal });
    this.panel.addEventListener("pointerenter", () => {
      this.inside = true;
    }, { signal });
    window.addEventListener("wheel", (event) => {
      this.lastWheel = { at: event.timeStamp, over: event.target.closest?.(".bs-film") && this.panel.contains(event.target),
        before: this.lastWheel };
      if (this.lastWheel.before) this.lastWheel.before.before = null;
    }, { signal, capture: true, passive: true });
    this.stopStore = this.store.on((event, detail) => this.storeTold(event, detail));
    this.onModel = [["change:radiological", () => this.refit()], ["change:cursor_mm", () => this.cursorFromModel()],
      ["change:selected", () => this.selectedFromModel()], ["change:notice", () => this.noticeFromModel()]];
    for (const [event, call] of this.onModel) this.model.on(event, call);
  }

  close() {
    this.ends.abort();
    this.stopStore();
    for (const [event, call] of this.onModel) this.model.off(event, call);
    for (const film of this.films) film.close();
    this.projection.close();
    cancelAnimationFrame(this.frame);
  }

  started() {
    this.lookChanged([]);
    if (this.store.grid) this.storeTold("table");
  }

  // -- drawing ------------------------------------------------------------------------------------------------------

  requestDraw() {
    if (this.frame) return;
    this.frame = requestAnimationFrame(() => {
      this.frame = null;
      for (const film of this.films) film.draw();
      if (this.needsReadout) this.readout.show(this.hand.at ? this.voxelAt(this.hand.at) : this.cursor);
      this.needsReadout = false;
    });
  }

  staleAll() {
    for (const film of this.films) film.stale();
  }

  staleTops() {
    for (const film of this.films) film.stale(true);
  }

  refit() {
    for (const film of this.films) film.resize();
    this.projection.later();
    say(this.displayWord, this.words[this.radiological ? "radiological_on" : "neurological_on"]);
    mark(this.display, "title", this.words[this.radiological ? "to_neurological" : "to_radiological"]);
  }

  lookChanged(keys) {
    mark(this.panel, "data-focus", ["sagittal", "coronal", "axial"][this.look.focus]);
    mark(this.panel, "data-contrast", this.look.contrast);
    mark(this.panel, "data-tool", this.look.tool);
    if (keys.includes("project") || keys.includes("scan") || keys.includes("windowMark")) this.projection.later();
    this.refreshControls();
    this.staleAll();
  }

  refreshControls() {
    for (const part of [this.rail, this.options, ...this.buttons, ...this.side]) part.refresh();
  }

  optionsChanged() {
    if (this.options) this.options.refresh();
  }

  storeTold(event, detail) {
    const { store } = this;
    if (event === "bits") this.bitsChanged(detail);
    else if (event === "table") {
      this.look.compartment = Math.min(this.look.compartment, store.styles.length - 1);
      this.cursorFromModel();
      this.refit();
      this.refreshControls();
      this.selectedFromModel();
      setTimeout(() => store.hasElements && store.volume("elements"), 400); // after the first picture
      if (detail && detail.notes && detail.notes.length) this.announce(detail.notes.join("; "));
    } else if (event === "fault") this.announce(detail.text);
    else if (event === "saved") this.announce(`${this.words.saved} ${detail.files.join(", ")}`);
    else if (event === "nothing") this.announce(this.words[`nothing_to_${detail.op}`]);
    else if (event === "places") {
      this.layers.flags.clear();
      this.layers.kept.clear();
      this.look.set({ shown: [] });
    }
    if (["table", "scans"].includes(event)) this.look.dropLost();
    if (event === "styles") this.look.compartment = Math.min(this.look.compartment, store.styles.length - 1);
    if (["styles", "patch", "scans", "elements", "shares"].includes(event)) {
      this.refreshControls();
      this.needsReadout = true;
      this.requestDraw();
    }
    if (event === "volume" && detail.volume === "scan:template") {
      store.grid.frameBy(store.volumes.get(detail.volume));
      this.fitAll();
    }
    if (["styles", "volume", "scans", "elements", "chances"].includes(event)) {
      this.needsReadout = true;
      if (event !== "styles") store.scanMark = (store.scanMark || 0) + 1;
      if (event === "elements") this.selectedFromModel();
      this.staleAll();
      this.projection.later();
    }
    if (event === "sent") this.watchKernel();
  }

  bitsChanged(box) {
    for (const film of this.films) {
      const { plane, index } = film;
      if (box && (index < box[2 * plane] || index >= box[2 * plane + 1])) continue;
      film.version += 1;
      film.stale();
    }
    this.projection.later(box);
    this.needsReadout = true;
    this.requestDraw();
  }

  /** Says so when the kernel takes long to answer; what was painted stands and waits. */
  watchKernel() {
    clearTimeout(this.kernelTimer);
    this.kernelTimer = setTimeout(() => {
      if (this.store.waiting > 0) say(this.status, this.words.kernel_busy.replace("{count}", this.store.waiting));
    }, 1500);
    if (this.status.textContent) say(this.status, "");
  }

  announce(text) {
    say(this.status, text);
    say(this.live, text);
  }

  noticeFromModel() {
    const notice = this.model.get("notice");
    if (notice) this.announce(notice);
  }
}

export default () => {
  let store = null;
  return {
    initialize({ model }) {
      store = new Store(model);
      return () => store.close();
    },
    render({ model, el }) {
      const view = new View(model, store, el);
      el.byway = view;
      return () => view.close();
    },
  };
};
