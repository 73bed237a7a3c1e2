// The crosshair of a view: where it is, how it moves, and the slices that follow it.
import { say } from "../front/kit.js";
import { inPlaneAxes } from "./raster.js";

/** The part of a view that keeps the crosshair. */
export class WithCursor {
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
}
