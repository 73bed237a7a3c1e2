// A stroke in hand: painted here at once, sent whole when the hand lifts. It carries its own plane and slice.
import { polygonVoxels, quantised, segmentVoxels } from "./raster.js";

/** The byte that an edit gives to a voxel, from the byte there: the rule of the kernel's edits. */
export function laidByte(byte, edit) {
  if (edit.mode === "cut") return edit.compartment === null ? 0 : byte & ~(1 << edit.compartment);
  if (edit.spare && byte !== 0) return byte;
  return 1 << edit.compartment;
}

export class Stroke {
  constructor(store, edit) {
    this.store = store;
    this.edit = { op: "stroke", points: [], ...edit };
    this.number = ++store.newest; // older answers no longer show what is here
    store.held = new Map();
  }

  /** Adds a point; one that moves by less than a quarter of a voxel is left out. */
  add(a, b) {
    const { points } = this.edit;
    const n = points.length;
    const [pa, pb] = [quantised(a), quantised(b)];
    if (n && Math.hypot(pa - points[n - 2], pb - points[n - 1]) < 0.25) return;
    points.push(pa, pb);
    const [qa, qb] = n ? [points[n - 2], points[n - 1]] : [pa, pb];
    this.paint(qa, qb, pa, pb);
  }

  paint(pa, pb, qa, qb) {
    const { store, edit } = this;
    const { bits, grid, held } = store;
    if (!bits) return;
    const reach = edit.radius + 1;
    segmentVoxels(grid.shape, edit.plane, edit.index, pa, pb, qa, qb, edit.radius, edit.ball, (voxel) => {
      if (held.has(voxel)) return;
      const byte = bits[voxel];
      const next = laidByte(byte, edit);
      held.set(voxel, byte);
      bits[voxel] = next;
    });
    store.tell("bits", boxOf(grid, edit, Math.min(pa, qa) - reach, Math.max(pa, qa) + reach, Math.min(pb, qb) - reach,
      Math.max(pb, qb) + reach, reach));
  }

  /** Sends the stroke. */
  end() {
    this.store.held = null;
    this.store.edit(this.edit, this.number);
  }

  /** Takes the stroke back before it was sent. */
  cancel() {
    const { bits, held } = this.store;
    for (const [voxel, byte] of held) bits[voxel] = byte;
    this.store.held = null;
    this.store.answered = Math.max(this.store.answered, this.number);
    this.store.tell("bits", null);
  }
}

/** Paints a polygon here and sends it. */
export function paintPolygon(store, edit) {
  const whole = { op: "polygon", ...edit };
  if (store.bits) {
    for (const voxel of polygonVoxels(store.grid.shape, edit.plane, edit.index, edit.points)) {
      store.bits[voxel] = laidByte(store.bits[voxel], whole);
    }
    store.tell("bits", boxOf(store.grid, edit, -Infinity, Infinity, -Infinity, Infinity, 0));
  }
  store.edit(whole);
}

function boxOf(grid, edit, a0, a1, b0, b1, reach) {
  const low = grid.clamp(grid.at(edit.plane, edit.index - (edit.ball ? reach : 0), a0, b0));
  const high = grid.clamp(grid.at(edit.plane, edit.index + (edit.ball ? reach : 0), a1, b1));
  return [low[0], high[0] + 1, low[1], high[1] + 1, low[2], high[2] + 1];
}
