// Where the elements and bands of a function's network lie: columns along its routes, rows from top to bottom of the brain.

const GAP = 68; // room above an element for its name
const PASS = 22;
const BAR = 12; // width of a region; segments are as long as the column allows
const FULL = 84; // height of a band that carries the whole function

/**
 * Boxes of nodes and bands of routes.
 *
 * nodes: [{id, kind, z, side}], z in mm (superior is larger); routes: [{key, path: [node numbers], usual, now}].
 * Returns {height, nodes: [{x, y, w, h}], bands: [{route, ghost, live, width}]}; coordinates in pixels.
 */
export function arrange(nodes, routes, width) {
  const depth = nodes.map(() => 0);
  for (let pass = 0; pass < nodes.length; pass += 1) {
    for (const route of routes) {
      for (let i = 1; i < route.path.length; i += 1) depth[route.path[i]] = Math.max(depth[route.path[i]], depth[route.path[i - 1]] + 1);
    }
  }
  const columns = Math.max(...depth) + 1;
  const pitch = width / Math.max(columns, 1);
  const { stops, paths } = withPassages(nodes, routes, depth);
  const load = stops.map((_, n) => routes.reduce((sum, route, r) => sum + (paths[r].includes(n) ? route.usual : 0), 0));
  const sideRank = { left: 0, midline: 1, right: 2 };
  const boxes = new Array(stops.length);
  let height = 0;
  const order = [...stops.keys()].sort((a, b) => sideRank[stops[a].side] - sideRank[stops[b].side] || stops[b].z - stops[a].z || a - b);
  const tall = [];
  for (let column = 0; column < columns; column += 1) {
    let y = 0;
    for (const n of order.filter((stop) => stops[stop].depth === column)) {
      const h = Math.max(8, load[n] * FULL);
      const { kind } = stops[n];
      const w = kind === "segment" ? Math.max(60, pitch - 34) : BAR;
      y += kind === "passage" ? PASS : GAP;
      boxes[n] = { x: column * pitch + 2, y, w, h, column };
      y += h;
    }
    tall[column] = y;
    height = Math.max(height, y);
  }
  for (const box of boxes) box.y += (height - tall[box.column]) / 2;
  return { height: height + 18, nodes: boxes.slice(0, nodes.length), bands: bands(routes, paths, boxes) };
}

/** Long steps of a route pass through every column between, each on a row of its own, so that nothing runs over a name. */
function withPassages(nodes, routes, depth) {
  const stops = nodes.map((node, n) => ({ kind: node.kind, z: node.z, side: node.side, depth: depth[n] }));
  const known = new Map();
  const paths = routes.map((route) => {
    const path = [route.path[0]];
    for (let i = 1; i < route.path.length; i += 1) {
      const [a, b] = [route.path[i - 1], route.path[i]];
      for (let d = depth[a] + 1; d < depth[b]; d += 1) {
        const key = `${a} ${b} ${d}`;
        if (!known.has(key)) {
          const part = (d - depth[a]) / (depth[b] - depth[a]);
          known.set(key, stops.push({ kind: "passage", side: nodes[a].side, depth: d, z: nodes[a].z + (nodes[b].z - nodes[a].z) * part }) - 1);
        }
        path.push(known.get(key));
      }
      path.push(b);
    }
    return path;
  });
  return { stops, paths };
}

function bands(routes, paths, boxes) {
  const used = boxes.map(() => 0);
  const slots = routes.map((route, r) => paths[r].map((n) => {
    const at = used[n];
    used[n] += route.usual * FULL;
    return at;
  }));
  return routes.map((route, r) => {
    const thick = Math.max(1.5, route.usual * FULL);
    const now = Math.max(0, route.now * FULL);
    const steps = [];
    for (let i = 1; i < paths[r].length; i += 1) {
      const a = boxes[paths[r][i - 1]], b = boxes[paths[r][i]];
      steps.push({ from: [a.x + a.w, a.y + slots[r][i - 1]], to: [b.x, b.y + slots[r][i]] });
    }
    const through = paths[r].slice(1, -1).map((n, i) => ({ box: boxes[n], at: slots[r][i + 1] }))
      .map(({ box, at }) => ({ from: [box.x, box.y + at], to: [box.x + box.w, box.y + at] }));
    const all = (size) => [...steps, ...through].map((step) => ribbon(step, size, thick)).join(" ");
    return { route: route.key, ghost: steps.map((step) => ribbon(step, thick, thick)).join(" "), live: all(now), thick, now };
  });
}

/** A band of even thickness, in the middle of its slot, that leaves and arrives level. */
function ribbon({ from, to }, thick, slot) {
  const lift = (slot - thick) / 2;
  const [x1, y1] = [from[0], from[1] + lift];
  const [x2, y2] = [to[0], to[1] + lift];
  const bend = (x2 - x1) / 2;
  return `M${x1} ${y1}C${x1 + bend} ${y1} ${x2 - bend} ${y2} ${x2} ${y2}V${y2 + thick}` +
    `C${x2 - bend} ${y2 + thick} ${x1 + bend} ${y1 + thick} ${x1} ${y1 + thick}Z`;
}
