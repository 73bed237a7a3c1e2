// What differs between two states, as a small picture: changed records and what they touch, in columns by kind.
import { fill, h, s } from "../front/kit.js";

const COLUMNS = ["source", "region", "pathway", "segment", "function", "sign", "claim", "norm"];
const SIGNS = { added: "+", changed: "▲", retired: "×", disputed: "!", same: "" };
const ROW = 30;
const WIDE = 168;
const GAP = 40;

export function drawPicture(picture, words) {
  const columns = COLUMNS.filter((kind) => picture.nodes.some((node) => node.kind === kind));
  const at = new Map();
  let tall = 1;
  columns.forEach((kind, c) => {
    const nodes = picture.nodes.filter((node) => node.kind === kind);
    tall = Math.max(tall, nodes.length);
    nodes.forEach((node, r) => at.set(node.id, [c * (WIDE + GAP), 24 + r * ROW]));
  });
  const [width, height] = [columns.length * (WIDE + GAP) - GAP + 4, 24 + tall * ROW];
  const lines = picture.edges.map((edge) => {
    let [a, b] = [at.get(edge.from), at.get(edge.to)];
    if (!a || !b) return null;
    if (a[0] > b[0]) [a, b] = [b, a];
    const [x1, y1, x2, y2] = [a[0] + WIDE, a[1] + 11, b[0], b[1] + 11];
    const half = GAP / 2;
    let d = `M${x1} ${y1}C${x1 + half} ${y1} ${x2 - half} ${y2} ${x2} ${y2}`;
    if (a[0] === b[0]) d = `M${x1} ${y1}C${x1 + 26} ${y1} ${x1 + 26} ${y2} ${x1} ${y2}`;
    // A line that passes other columns runs in the gap between two rows, so that it does not seem to end on the way.
    else if (x2 - x1 > GAP) d = `M${x1} ${y1}C${x1 + half} ${y1} ${x1 + half} ${b[1] - 4} ${x1 + GAP} ${b[1] - 4}H${x2 - GAP}C${x2 - half} ${b[1] - 4} ${x2 - half} ${y2} ${x2} ${y2}`;
    return s("path", { class: `be-edge be-how-${edge.how}`, d });
  });
  const boxes = picture.nodes.map((node) => {
    const [x, y] = at.get(node.id);
    const label = `${node.name} (${words[`of_${node.kind}`] || node.kind}, ${words[`how_${node.how}`]})`;
    const short = node.name.length > 25 ? `${node.name.slice(0, 24)}…` : node.name;
    return s("g", { class: `be-node be-how-${node.how}`, transform: `translate(${x} ${y})`, "data-node": node.id }, s("title", {}, label),
      s("rect", { width: WIDE, height: 22, rx: 5 }), s("text", { x: 9, y: 15 }, SIGNS[node.how] ? `${SIGNS[node.how]} ${short}` : short));
  });
  const heads = columns.map((kind, c) => s("text", { class: "be-column", x: c * (WIDE + GAP), y: 13 }, words[`of_${kind}`] || kind));
  const svg = s("svg", { class: "be-diagram", viewBox: `-2 0 ${width} ${height}`, width, height, role: "img", "aria-label": words.picture }, lines, heads, boxes);
  return h("figure", { class: "be-figure" }, h("div", { class: "be-figure-scroll", tabindex: "0", role: "group", "aria-label": words.picture }, svg), h("figcaption", { class: "bw-soft" }, words.picture_key,
    picture.more ? ` ${fill(words.picture_more, { count: picture.more })}` : null));
}
