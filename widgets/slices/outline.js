// Outlines of voxels on a slice, as closed loops along voxel borders.

/**
 * Traces the border of a mask (`width` x `height`, row by row) into loops of corner points [x0, y0, x1, y1, ...];
 * straight runs are merged. The inside lies on the right of the direction of travel, so that holes run the other way.
 */
export function traceLoops(mask, width, height) {
  // Edges by start corner; at most two start at one corner (where voxels touch diagonally).
  const across = width + 1;
  const starts = new Map();
  const add = (from, to) => {
    const there = starts.get(from);
    if (there === undefined) starts.set(from, to);
    else starts.set(from, [there, to].flat());
  };
  for (let y = 0, n = 0; y < height; y++) {
    for (let x = 0; x < width; x++, n++) {
      if (!mask[n]) continue;
      const corner = y * across + x;
      if (y === 0 || !mask[n - width]) add(corner, corner + 1);
      if (x === width - 1 || !mask[n + 1]) add(corner + 1, corner + 1 + across);
      if (y === height - 1 || !mask[n + width]) add(corner + 1 + across, corner + across);
      if (x === 0 || !mask[n - 1]) add(corner + across, corner);
    }
  }
  const loops = [];
  while (starts.size) {
    const first = starts.keys().next().value;
    const corners = [];
    let at = first;
    let last = 0;
    do {
      const there = starts.get(at);
      let next = there;
      if (Array.isArray(there)) {
        // Where two loops touch, turn so that they stay two: the turn that follows the same voxel.
        next = there.find((to) => to - at === turned(last, across)) ?? there[0];
        const rest = there.filter((to) => to !== next);
        starts.set(at, rest.length === 1 ? rest[0] : rest);
      } else {
        starts.delete(at);
      }
      if (next - at !== last) corners.push(at);
      last = next - at;
      at = next;
    } while (at !== first);
    loops.push(Float32Array.from(corners.flatMap((corner) => [corner % across, Math.floor(corner / across)])));
  }
  return loops;
}

function turned(step, across) {
  if (step === 1) return across;
  if (step === across) return -1;
  if (step === -1) return -across;
  return 1;
}

/** Loops as a path in plane coordinates, where a voxel reaches half a unit to each side of its centre. */
export function pathOf(loops) {
  const path = new Path2D();
  for (const loop of loops) {
    path.moveTo(loop[0] - 0.5, loop[1] - 0.5);
    for (let i = 2; i < loop.length; i += 2) path.lineTo(loop[i] - 0.5, loop[i + 1] - 0.5);
    path.closePath();
  }
  return path;
}
