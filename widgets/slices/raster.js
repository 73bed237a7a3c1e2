// Strokes and polygons to voxels, in float32, rounding where byway.widgets.state.raster rounds, in the same order:
// what is painted here at once is what the kernel paints later.

const f = Math.fround;

/** The two axes of a plane (named by its normal axis), ascending. */
export function inPlaneAxes(plane) {
  return plane === 0 ? [1, 2] : plane === 1 ? [0, 2] : [0, 1];
}

/** Sixteenths of a voxel: short in JSON, exact in float32. */
export function quantised(value) {
  return Math.round(value * 16) / 16;
}

function strides(shape) {
  return [shape[1] * shape[2], shape[2], 1];
}

/** Calls `hit(flat index)` for every voxel within `radius` of one segment (pa, pb)-(qa, qb) drawn on a slice. */
export function segmentVoxels(shape, plane, index, pa, pb, qa, qb, radius, ball, hit) {
  const [first, second] = inPlaneAxes(plane);
  const step = strides(shape);
  const pad = Math.ceil(radius);
  const a0 = Math.max(Math.floor(Math.min(pa, qa)) - pad, 0);
  const a1 = Math.min(Math.ceil(Math.max(pa, qa)) + pad, shape[first] - 1);
  const b0 = Math.max(Math.floor(Math.min(pb, qb)) - pad, 0);
  const b1 = Math.min(Math.ceil(Math.max(pb, qb)) + pad, shape[second] - 1);
  const reach = ball ? pad : 0;
  const k0 = Math.max(index - reach, 0);
  const k1 = Math.min(index + reach, shape[plane] - 1);
  const da = f(qa - pa);
  const db = f(qb - pb);
  const length = f(f(da * da) + f(db * db));
  const square = f(f(radius) * f(radius));
  for (let a = a0; a <= a1; a++) {
    for (let b = b0; b <= b1; b++) {
      let ea = f(a - pa);
      let eb = f(b - pb);
      if (length > 0) {
        let along = f(f(f(ea * da) + f(eb * db)) / length);
        along = Math.min(Math.max(along, 0), 1);
        ea = f(a - f(pa + f(along * da)));
        eb = f(b - f(pb + f(along * db)));
      }
      const near = f(f(ea * ea) + f(eb * eb));
      if (near > square) continue;
      const base = a * step[first] + b * step[second];
      for (let k = k0; k <= k1; k++) {
        const gap = f(k - index);
        if (f(near + f(gap * gap)) <= square) hit(base + k * step[plane]);
      }
    }
  }
}

/** Flat indices, ascending, of a whole stroke: `points` is [a0, b0, a1, b1, ...]. */
export function strokeVoxels(shape, plane, index, points, radius, ball) {
  const found = new Set();
  const hit = (voxel) => found.add(voxel);
  const n = points.length / 2;
  for (let i = 0; i < Math.max(1, n - 1); i++) {
    const j = n > 1 ? i + 1 : i;
    segmentVoxels(shape, plane, index, points[2 * i], points[2 * i + 1], points[2 * j], points[2 * j + 1], radius, ball,
      hit);
  }
  return Uint32Array.from(found).sort();
}

/** Flat indices, ascending, of the voxels of a slice whose centre lies in a closed polygon (even-odd). */
export function polygonVoxels(shape, plane, index, points) {
  const n = points.length / 2;
  if (n < 3) return new Uint32Array(0);
  const [first, second] = inPlaneAxes(plane);
  const step = strides(shape);
  let [a0, a1, b0, b1] = [Infinity, -Infinity, Infinity, -Infinity];
  for (let i = 0; i < n; i++) {
    a0 = Math.min(a0, points[2 * i]);
    a1 = Math.max(a1, points[2 * i]);
    b0 = Math.min(b0, points[2 * i + 1]);
    b1 = Math.max(b1, points[2 * i + 1]);
  }
  const found = [];
  for (let a = Math.max(Math.floor(a0), 0); a <= Math.min(Math.ceil(a1), shape[first] - 1); a++) {
    for (let b = Math.max(Math.floor(b0), 0); b <= Math.min(Math.ceil(b1), shape[second] - 1); b++) {
      let inside = false;
      for (let i = 0; i < n; i++) {
        const j = (i + 1) % n;
        const [pa, pb, qa, qb] = [points[2 * i], points[2 * i + 1], points[2 * j], points[2 * j + 1]];
        if (pb === qb || pb > b === qb > b) continue;
        const crossing = f(f(f(f(qa - pa) * f(b - pb)) / f(qb - pb)) + pa);
        if (a < crossing) inside = !inside;
      }
      if (inside) found.push(a * step[first] + b * step[second] + index * step[plane]);
    }
  }
  return Uint32Array.from(found).sort();
}
