// Planes, voxels, millimetres and the screen. A plane is named by its normal axis: 0 sagittal, 1 coronal, 2 axial;
// its plane coordinates (a, b) run along the two other axes, ascending. +x is the person's right, +y front, +z top.
import { inPlaneAxes } from "./raster.js";

export const PLANES = [2, 1, 0];

/** -1 where `a` grows to the left on the screen. The front is left on sagittal planes, whichever display is on. */
export function flipOf(plane, radiological) {
  return plane === 0 || radiological ? -1 : 1;
}

/** Letters at left, right, top, bottom of a plane. */
export function letters(plane, radiological) {
  if (plane === 0) return ["front", "back", "top", "bottom"];
  const [left, right] = radiological ? ["right", "left"] : ["left", "right"];
  return plane === 1 ? [left, right, "top", "bottom"] : [left, right, "front", "back"];
}

/** Grid of the volumes: shape, millimetres (axes along x, y, z), flat indices. */
export class Grid {
  constructor(shape, affine) {
    this.shape = shape;
    this.step = [shape[1] * shape[2], shape[2], 1];
    this.spacing = [affine[0][0], affine[1][1], affine[2][2]];
    this.origin = [affine[0][3], affine[1][3], affine[2][3]];
  }

  toMm(voxel) {
    return voxel.map((v, axis) => v * this.spacing[axis] + this.origin[axis]);
  }

  toVoxel(mm) {
    return mm.map((v, axis) => (v - this.origin[axis]) / this.spacing[axis]);
  }

  /** Nearest voxel inside the grid. */
  clamp(voxel) {
    return voxel.map((v, axis) => Math.min(Math.max(Math.round(v), 0), this.shape[axis] - 1));
  }

  holds(voxel) {
    return voxel.every((v, axis) => Math.round(v) >= 0 && Math.round(v) < this.shape[axis]);
  }

  flat(voxel) {
    return voxel[0] * this.step[0] + voxel[1] * this.step[1] + voxel[2];
  }

  /** Width and height of a plane in voxels. */
  size(plane) {
    const [first, second] = inPlaneAxes(plane);
    return [this.shape[first], this.shape[second]];
  }

  /** Box [a0, a1, b0, b1] of what is worth seeing on a plane: the brain where it is known, else the whole grid. */
  frame(plane) {
    const [first, second] = inPlaneAxes(plane);
    const of = (axis) => (this.extent ? this.extent[axis] : [0, this.shape[axis] - 1]);
    return [...of(first), ...of(second)];
  }

  /** Takes the frame from a volume: where it differs from its first voxel. */
  frameBy(volume) {
    const extent = this.shape.map(() => [Infinity, -Infinity]);
    const nothing = volume[0];
    for (let i = 0, n = 0; i < this.shape[0]; i++) {
      for (let j = 0; j < this.shape[1]; j++) {
        for (let k = 0; k < this.shape[2]; k++, n++) {
          if (volume[n] === nothing) continue;
          [i, j, k].forEach((v, axis) => {
            if (v < extent[axis][0]) extent[axis][0] = v;
            if (v > extent[axis][1]) extent[axis][1] = v;
          });
        }
      }
    }
    if (extent[0][0] < extent[0][1]) this.extent = extent;
  }

  /** The voxel at plane coordinates. */
  at(plane, index, a, b) {
    const [first, second] = inPlaneAxes(plane);
    const voxel = [0, 0, 0];
    voxel[plane] = index;
    voxel[first] = a;
    voxel[second] = b;
    return voxel;
  }

  /** Plane coordinates of a voxel. */
  on(plane, voxel) {
    const [first, second] = inPlaneAxes(plane);
    return [voxel[first], voxel[second]];
  }

  /** Reads one slice of a flat volume into `out`, row by row (b), through `map`. */
  slice(volume, plane, index, out, map) {
    const [first, second] = inPlaneAxes(plane);
    const [width, height] = this.size(plane);
    const base = index * this.step[plane];
    for (let b = 0, n = 0; b < height; b++) {
      let at = base + b * this.step[second];
      for (let a = 0; a < width; a++, at += this.step[first]) out[n++] = map ? map[volume[at]] : volume[at];
    }
    return out;
  }
}

/** How a plane lies on its canvas; all in device pixels. */
export class Sight {
  constructor() {
    this.zoom = 1;
    this.centre = [0, 0];
    this.off = true; // off centre: the next fit brings it to the middle
    this.fit = 1;
    this.flip = 1;
    this.middle = [0, 0];
  }

  /** Fits a box [a0, a1, b0, b1] of plane coordinates into a canvas of `width` x `height`. */
  resize(width, height, box, flip, margin) {
    this.middle = [width / 2, height / 2];
    this.flip = flip;
    this.fit = Math.max(0.05, Math.min((width - 2 * margin) / (box[1] - box[0]), (height - 2 * margin) / (box[3] - box[2])));
    if (this.off) this.centre = [(box[0] + box[1]) / 2, (box[2] + box[3]) / 2];
    this.off = false;
  }

  get scale() {
    return this.fit * this.zoom;
  }

  toScreen(a, b) {
    return [this.middle[0] + (a - this.centre[0]) * this.scale * this.flip,
      this.middle[1] - (b - this.centre[1]) * this.scale];
  }

  toPlane(x, y) {
    return [(x - this.middle[0]) / (this.scale * this.flip) + this.centre[0],
      (this.middle[1] - y) / this.scale + this.centre[1]];
  }

  /** Matrix from plane coordinates to the screen. */
  get matrix() {
    const s = this.scale;
    return [s * this.flip, 0, 0, -s, this.middle[0] - this.centre[0] * s * this.flip,
      this.middle[1] + this.centre[1] * s];
  }

  zoomAt(x, y, factor) {
    const [a, b] = this.toPlane(x, y);
    this.zoom = Math.min(Math.max(this.zoom * factor, 0.5), 24);
    const [x1, y1] = this.toScreen(a, b);
    this.pan(x - x1, y - y1);
  }

  pan(dx, dy) {
    this.centre = [this.centre[0] - dx / (this.scale * this.flip), this.centre[1] + dy / this.scale];
  }

  reset() {
    this.zoom = 1;
    this.off = true;
  }
}
