// Tools with handles: dropping an ellipsoid, and moving or scaling what is drawn. Both show what they will do on all
// films; Enter or the button lays it, Escape takes it back.
import { h } from "../front/kit.js";
import { COMPARTMENTS, LINE } from "./looks.js";
import { inPlaneAxes } from "./raster.js";
import { layFields, ring } from "./tools.js";

const GRIP = 9; // CSS pixels around a handle that catch a finger or pointer

/** Handles of a shape on a film: centre and the ends of its half-axes, [{name, axis, sign, x, y}]. */
function handles(film, centre, radii) {
  const [first, second] = inPlaneAxes(film.plane);
  const [a, b] = [centre[first], centre[second]];
  const list = [{ name: "centre", point: [a, b] }];
  for (const sign of [-1, 1]) {
    list.push({ name: "radius", axis: first, sign, point: [a + sign * radii[first], b] });
    list.push({ name: "radius", axis: second, sign, point: [a, b + sign * radii[second]] });
  }
  return list.map((handle) => {
    const [x, y] = film.sight.toScreen(...handle.point);
    return { ...handle, x, y };
  });
}

function caught(film, list, point) {
  const reach = GRIP * 1.6 * film.ratio;
  return list.find((handle) => Math.hypot(handle.x - point.x, handle.y - point.y) < reach);
}

/** A sphere or ellipsoid, placed by a click and shaped by its handles, before it is laid. */
export class Drop {
  constructor(view) {
    this.view = view;
    this.centre = null;
    this.radii = [10, 10, 10];
  }

  down(film, point) {
    const grip = this.centre && caught(film, handles(film, this.centre, this.radii), point);
    if (grip) this.grip = grip;
    else {
      this.centre = this.view.store.grid.at(film.plane, film.index, point.a, point.b);
      this.grip = { name: "centre" };
    }
    this.view.optionsChanged();
    this.view.staleTops();
  }

  move(film, point) {
    if (!this.grip) return;
    const [first, second] = inPlaneAxes(film.plane);
    if (this.grip.name === "centre") {
      this.centre[first] = point.a;
      this.centre[second] = point.b;
    } else {
      const value = this.grip.axis === first ? point.a : point.b;
      const radius = Math.min(Math.max(Math.abs(value - this.centre[this.grip.axis]), 1), 80);
      if (this.view.look.sphere) this.radii = [radius, radius, radius];
      else this.radii[this.grip.axis] = radius;
    }
    this.view.optionsChanged();
    this.view.staleTops();
  }

  up() {
    this.grip = null;
  }

  act(film, point) {
    if (this.centre) this.lay();
    else this.down(film, { ...point, x: Infinity, y: Infinity });
    this.up();
  }

  close() {
    this.lay();
  }

  lay() {
    if (!this.centre) return;
    const { store, look } = this.view;
    const centre = store.grid.toMm(this.centre).map((v) => Math.round(v * 10) / 10);
    const radii = this.radii.map((v) => Math.round(v * 10) / 10);
    this.centre = null;
    this.view.command({ op: "ellipsoid", centre_mm: centre, radii_mm: radii, ...layFields(look, look.cutShape) });
    this.view.optionsChanged();
  }

  cancel() {
    this.centre = null;
    this.view.optionsChanged();
  }

  draw(film, ctx) {
    if (!this.centre) return;
    const [first, second] = inPlaneAxes(film.plane);
    const depth = (film.index - this.centre[film.plane]) / this.radii[film.plane];
    const { scale } = film.sight;
    const [x, y] = film.sight.toScreen(this.centre[first], this.centre[second]);
    const colour = COMPARTMENTS[this.view.look.compartment].colour;
    if (Math.abs(depth) <= 1) {
      const cut = Math.sqrt(1 - depth * depth);
      ctx.beginPath();
      ctx.ellipse(x, y, this.radii[first] * cut * scale, this.radii[second] * cut * scale, 0, 0, 7);
      ctx.fillStyle = `${colour}55`;
      ctx.fill();
      ctx.strokeStyle = colour;
      ctx.lineWidth = 2 * film.ratio;
      ctx.stroke();
    }
    for (const handle of handles(film, this.centre, this.radii)) {
      ring(ctx, handle.x, handle.y, (handle.name === "centre" ? 4 : 5) * film.ratio, LINE, film.ratio);
    }
  }

  /** What stands in the options row while this tool is out. */
  options(words) {
    const mm = this.radii.map((r) => r.toFixed(0)).join(" × ");
    return h("span", { class: "bs-option-text" }, this.centre ? `${mm} mm` : words.drop_hint);
  }
}

/** Drags the drawing, or scales it by the handles of its box. */
export class Move {
  constructor(view) {
    this.view = view;
    this.cancel();
  }

  /** Bounding box of what will move, as centre and half-axes. */
  extent() {
    const { store, look } = this.view;
    const test = look.moveAll ? 255 : 1 << look.compartment;
    const { shape } = store.grid;
    const low = [Infinity, Infinity, Infinity];
    const high = [-Infinity, -Infinity, -Infinity];
    const { bits } = store;
    for (let i = 0, n = 0; i < shape[0]; i++) {
      for (let j = 0; j < shape[1]; j++) {
        for (let k = 0; k < shape[2]; k++, n++) {
          if (!(bits[n] & test)) continue;
          const voxel = [i, j, k];
          for (let axis = 0; axis < 3; axis++) {
            low[axis] = Math.min(low[axis], voxel[axis]);
            high[axis] = Math.max(high[axis], voxel[axis]);
          }
        }
      }
    }
    if (low[0] === Infinity) return null;
    return { centre: low.map((v, axis) => (v + high[axis]) / 2), radii: low.map((v, axis) => (high[axis] - v) / 2 + 1) };
  }

  down(film, point) {
    this.box = this.box || this.extent();
    if (!this.box) {
      this.view.announce(this.view.words.nothing_drawn);
      return;
    }
    const centre = this.box.centre.map((v, axis) => v + this.shift[axis]);
    const grip = caught(film, handles(film, centre, this.box.radii.map((r) => r * this.scale)), point);
    this.grip = grip && grip.name === "radius" ? grip : { name: "centre" };
    this.from = point;
    this.before = [...this.shift];
  }

  move(film, point) {
    if (!this.grip || !this.box) return;
    const [first, second] = inPlaneAxes(film.plane);
    if (this.grip.name === "centre") {
      this.shift[first] = Math.round(this.before[first] + point.a - this.from.a);
      this.shift[second] = Math.round(this.before[second] + point.b - this.from.b);
    } else {
      const { axis } = this.grip;
      const value = axis === first ? point.a : point.b;
      const reach = Math.abs(value - this.box.centre[axis] - this.shift[axis]) / this.box.radii[axis];
      this.scale = Math.min(Math.max(Math.round(reach * 50) / 50, 0.2), 4);
    }
    this.view.optionsChanged();
    this.view.staleTops();
  }

  up() {
    this.grip = null;
  }

  /** Moves by whole voxels from the keyboard. */
  nudge(axis, by) {
    this.box = this.box || this.extent();
    if (!this.box) return;
    this.shift[axis] += by;
    this.view.optionsChanged();
    this.view.staleTops();
  }

  act() {
    this.close();
  }

  close() {
    if (this.box && (this.scale !== 1 || this.shift.some((v) => v))) {
      const { look } = this.view;
      this.view.command({ op: "place", shift: this.shift, scale: this.scale,
        compartment: look.moveAll ? null : look.compartment });
    }
    this.cancel();
  }

  cancel() {
    [this.box, this.shift, this.scale, this.grip] = [null, [0, 0, 0], 1, null];
    this.view.optionsChanged();
  }

  draw(film, ctx) {
    if (!this.box) return;
    const [first, second] = inPlaneAxes(film.plane);
    const colour = COMPARTMENTS[this.view.look.compartment].colour;
    const source = Math.round((film.index - this.shift[film.plane] - this.box.centre[film.plane]) / this.scale
      + this.box.centre[film.plane]);
    ctx.save();
    const matrix = new DOMMatrix(film.sight.matrix);
    const [ca, cb] = [this.box.centre[first], this.box.centre[second]];
    matrix.translateSelf(this.shift[first] + ca, this.shift[second] + cb);
    matrix.scaleSelf(this.scale, this.scale);
    matrix.translateSelf(-ca, -cb);
    const { look, layers, store } = this.view;
    if (source >= 0 && source < store.grid.shape[film.plane]) {
      for (const { path, compartment } of layers.compartments(film.plane, source, store.edits, "moved")) {
        if (!look.moveAll && compartment !== look.compartment) continue;
        const placed = new Path2D();
        placed.addPath(path, matrix);
        ctx.strokeStyle = COMPARTMENTS[compartment].colour;
        ctx.lineWidth = 2 * film.ratio;
        ctx.setLineDash([6 * film.ratio, 4 * film.ratio]);
        ctx.stroke(placed);
      }
    }
    ctx.restore();
    const centre = this.box.centre.map((v, axis) => v + this.shift[axis]);
    for (const handle of handles(film, centre, this.box.radii.map((r) => r * this.scale))) {
      ring(ctx, handle.x, handle.y, 5 * film.ratio, handle.name === "centre" ? colour : LINE, film.ratio);
    }
  }

  options(words) {
    const text = this.box
      ? `${this.shift.map((v) => (v > 0 ? `+${v}` : String(v).replace("-", "\u2212"))).join(", ")} mm · × ${this.scale.toFixed(2)}` : words.move_hint;
    return h("span", { class: "bs-option-text" }, text);
  }
}
