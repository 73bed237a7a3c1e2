// The slices panel: one store a model, one view a cell.
import { frame, freshId, h, mark, say } from "../front/kit.js";
import { backgrounds } from "./backgrounds.js";
import { commandButton, optionsRow, rail } from "./controls.js";
import { commandFor, commandsOf } from "./commands.js";
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
import { inPlaneAxes } from "./raster.js";
import { readout } from "./readout.js";
import { Store } from "./store.js";

class View {
  constructor(model, store, el) {
    this.model = model;
    this.store = store;
    this.words = model.get("words");
    this.listId = freshId("elements");
    this.ends = new AbortController();
    this.cursor = [98, 134, 72];
    this.look = new LookState(store, (keys) => this.lookChanged(keys));
    this.layers = new Layers(store, this.look);
    this.layers.compartmentsAt = (plane, index) => this.layers.compartments(plane, index, `at ${this.films[0].version}`);
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
    this.display = h("button", { type: "button", class: "bs-button", onclick: () => this.setRadiological(!this.radiological) });
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
    say(this.display, this.words[this.radiological ? "radiological_on" : "neurological_on"]);
    mark(this.display, "title", this.words.radiological);
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
    } else if (event === "fault") this.announce(detail.text);
    else if (event === "saved") this.announce(`${this.words.saved} ${detail.files.join(", ")}`);
    else if (event === "nothing") this.announce(this.words[`nothing_to_${detail.op}`]);
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

  // -- crosshair ----------------------------------------------------------------------------------------------------

  voxelAt({ film, a, b }) {
    return this.store.grid.at(film.plane, film.index, a, b);
  }

  moveCursor(plane, index, a, b) {
    this.setCursor(this.store.grid.at(plane, index, a, b));
  }

  setCursor(voxel) {
    this.showCursor(this.store.grid.clamp(voxel));
    this.model.set("cursor_mm", this.store.grid.toMm(this.cursor));
    clearTimeout(this.saving);
    this.saving = setTimeout(() => this.model.save_changes(), 60);
  }

  showCursor(voxel) {
    const before = this.cursor;
    this.cursor = voxel;
    for (const film of this.films) film.stale(before[film.plane] === voxel[film.plane]);
    this.projection.later();
    this.needsReadout = true;
  }

  cursorFromModel() {
    if (this.store.grid) this.showCursor(this.store.grid.clamp(this.store.grid.toVoxel(this.model.get("cursor_mm"))));
  }

  stepSlice(plane, by) {
    const voxel = [...this.cursor];
    voxel[plane === null ? this.activeFilm.plane : plane] += by;
    this.setCursor(voxel);
  }

  /** Moves along the axes of the active film, as seen on the screen. */
  nudge(axis, by) {
    const film = this.activeFilm;
    const along = inPlaneAxes(film.plane)[axis];
    const step = axis === 0 ? by * film.sight.flip : by;
    if (this.look.tool === "move") {
      this.hand.tool.nudge(along, step);
      return;
    }
    const voxel = [...this.cursor];
    voxel[along] += step;
    this.setCursor(voxel);
    this.sayWhere();
  }

  sayWhere() {
    clearTimeout(this.saying);
    this.saying = setTimeout(() => say(this.live, this.readout.textContent), 500);
  }

  hover() {
    this.needsReadout = true;
    this.requestDraw();
  }

  get activeFilm() {
    return this.films.find((film) => film.node.contains(document.activeElement))
      || this.films.find((film) => film.plane === this.look.focus);
  }

  zoom(factor) {
    const film = this.activeFilm;
    film.sight.zoomAt(...film.sight.toScreen(...this.store.grid.on(film.plane, this.cursor)), factor);
    film.stale();
  }

  fitAll() {
    for (const film of this.films) {
      film.sight.reset();
      film.resize();
    }
  }

  /** Puts the crosshair in the middle of what is drawn. */
  goToLesion() {
    const box = this.hand.tools.move.extent();
    if (box) this.setCursor(box.centre);
    else this.announce(this.words.nothing_drawn);
  }

  // -- commands -----------------------------------------------------------------------------------------------------

  command(edit) {
    this.store.edit(edit);
  }

  takeTool(tool) {
    this.hand.cancel();
    this.look.set({ tool });
    say(this.live, this.words[`tool_${tool}`]);
  }

  actAtCursor() {
    const film = this.activeFilm;
    const [a, b] = this.store.grid.on(film.plane, this.cursor);
    const [x, y] = film.sight.toScreen(a, b);
    if (this.hand.tool.act) this.hand.tool.act(film, { a, b, x, y });
    this.staleTops();
  }

  finish() {
    if (this.hand.tool.close) this.hand.tool.close();
    this.staleTops();
  }

  resize(mm) {
    this.command({ op: "resize", mm, compartment: this.look.compartment });
  }

  fillBetween() {
    this.command({ op: "fill_between", plane: this.activeFilm.plane, compartment: this.look.compartment });
  }

  addCompartment() {
    const n = this.store.styles.length;
    this.command({ op: "add_compartment", name: `${this.words.kind_other} ${n + 1}`, kind: "other", effect: 0.5 });
    this.look.set({ compartment: n });
  }

  removeCompartment(n) {
    this.look.compartment = Math.max(0, this.look.compartment - (this.look.compartment >= n ? 1 : 0));
    this.command({ op: "remove_compartment", compartment: n });
  }

  nextScan() {
    const keys = this.store.scans.map((s) => s.key);
    this.look.set({ scan: keys[(keys.indexOf(this.look.scan) + 1) % keys.length] });
  }

  setRadiological(on) {
    this.model.set("radiological", on);
    this.model.save_changes();
    this.refit();
    this.announce(this.words[on ? "radiological_on" : "neurological_on"]);
  }

  /** Tells all panels that an element was picked; this one outlines it. */
  pickElement(id) {
    this.model.set("selected", id);
    this.model.save_changes();
    this.outline(id, true);
  }

  /** Outlines an element; a passing outline makes room for the next one. */
  outline(id, passing) {
    const position = this.store.elements ? this.store.elements.ids.indexOf(id) : -1;
    const kept = this.look.shown.filter((s) => !s.passing);
    if (position < 0 || kept.some((s) => s.position === position)) return;
    this.look.set({ shown: [...kept, { position, fill: passing, segment: id.includes("."), passing }] });
  }

  selectedFromModel() {
    const id = this.model.get("selected");
    if (id) this.outline(id, true);
    else if (this.look.shown.some((s) => s.passing)) this.look.set({ shown: this.look.shown.filter((s) => !s.passing) });
  }

  toggleHelp() {
    this.help.hidden = !this.help.hidden;
    if (!this.help.hidden) this.help.focus();
    else this.activeFilm.node.focus();
  }

  key(event) {
    event.stopPropagation(); // notebooks bind plain letters
    const typing = event.target.closest("input:not([type=range]):not([type=checkbox]), select, textarea");
    if (!this.help.hidden && event.key === "Escape") {
      this.toggleHelp();
      return;
    }
    if (typing || (event.target.closest("button, summary, input") && ["Enter", " "].includes(event.key))) return;
    if (event.target.closest("input[type=range], [role=radiogroup]") && event.key.startsWith("Arrow")) return;
    if (event.key === " ") {
      this.spaceDown = true;
      event.preventDefault();
      return;
    }
    const found = commandFor(this.commands, event);
    if (!found) return;
    event.preventDefault();
    found[0].run(found[1]);
  }

  /** Whether a wheel event belongs to a scroll of the page that began outside the films. */
  scrollingPast(event) {
    const before = this.lastWheel && this.lastWheel.before;
    const passing = before && !before.over && event.timeStamp - before.at < 250;
    if (passing) this.lastWheel.over = false;
    return Boolean(passing);
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
