// The whole graph on one canvas: the brain from the side in the middle, functions and signs by domain around it.
import { h } from "../front/kit.js";

const TONES = { region: "#0072b2", segment: "#e69f00", function: "#009e73", sign: "#cc79a7" };

/** Fixed places for all nodes, in a square of side 2 around the origin: an edit moves nothing but what it adds. */
export function places(nodes, domains) {
  const at = new Map();
  const sector = (2 * Math.PI) / domains.length;
  const counts = new Map();
  for (const node of nodes) {
    if (node.kind === "region" || node.kind === "segment") {
      const r = node.kind === "region" ? 1 : 0.86;
      at.set(node.key, [(-(node.y + 18) / 100) * 0.66 * r, (-(node.z - 8) / 100) * 0.66 * r]);
    } else {
      const key = `${node.kind} ${node.domain}`;
      const i = counts.get(key) || 0;
      counts.set(key, i + 1);
      const many = nodes.filter((other) => other.kind === node.kind && other.domain === node.domain).length;
      const angle = (domains.indexOf(node.domain) + (i + 0.5) / many) * sector - Math.PI / 2;
      const radius = node.kind === "function" ? 0.7 : 0.96;
      at.set(node.key, [Math.cos(angle) * radius, Math.sin(angle) * radius]);
    }
  }
  return at;
}

/** A canvas with pan (drag, arrow keys), zoom (wheel, plus and minus) and picking. */
export function makeWheel(words, pick, point) {
  const canvas = h("canvas", { class: "bw-wheel", tabindex: "0", role: "img", "aria-label": words.wheel_label });
  const tip = h("div", { class: "bw-wheel-tip", hidden: true });
  const board = h("div", { class: "bw-wheel-board" }, canvas, tip);
  let view = { x: 0, y: 0, zoom: 1 };
  let drawn = null;
  let asked = false;
  let hover = null;

  function size() {
    const width = board.clientWidth || 800;
    const height = Math.min(760, Math.max(420, width * 0.72));
    const ratio = window.devicePixelRatio || 1;
    if (canvas.width !== Math.round(width * ratio) || canvas.height !== Math.round(height * ratio)) {
      canvas.width = Math.round(width * ratio);
      canvas.height = Math.round(height * ratio);
      canvas.style.width = `${width}px`;
      canvas.style.height = `${height}px`;
    }
    return { width, height, ratio };
  }

  function ask() {
    if (asked) return;
    asked = true;
    requestAnimationFrame(() => {
      asked = false;
      paint();
    });
  }

  function onScreen([x, y]) {
    const { width, height } = size();
    const unit = (Math.min(width, height) / 2 - 12) * view.zoom;
    return [width / 2 + (x + view.x) * unit, height / 2 + (y + view.y) * unit];
  }

  function paint() {
    if (!drawn || !board.clientWidth) return;
    const { width, height, ratio } = size();
    const c = canvas.getContext("2d");
    const ink = getComputedStyle(board).color;
    c.setTransform(ratio, 0, 0, ratio, 0, 0);
    c.clearRect(0, 0, width, height);
    const at = new Map([...drawn.at].map(([key, spot]) => [key, onScreen(spot)]));
    c.lineWidth = 0.7;
    for (const lit of [false, true]) {
      for (const edge of drawn.edges) {
        const on = edge.a === hover || edge.b === hover;
        if (on !== lit) continue;
        const [a, b] = [at.get(edge.a), at.get(edge.b)];
        if (!a || !b) continue;
        c.globalAlpha = on ? 0.95 : hover ? 0.05 : edge.relation === "joins" ? 0.16 : 0.1;
        c.strokeStyle = edge.disputed ? "#d55e00" : ink;
        c.setLineDash(edge.disputed ? [4, 3] : []);
        c.beginPath();
        c.moveTo(a[0], a[1]);
        const mid = [width / 2 + view.x * 100 * view.zoom, height / 2 + view.y * 100 * view.zoom];
        c.quadraticCurveTo((a[0] + b[0] + mid[0]) / 3, (a[1] + b[1] + mid[1]) / 3, b[0], b[1]);
        c.stroke();
      }
    }
    c.setLineDash([]);
    for (const node of drawn.nodes) {
      const [x, y] = at.get(node.key);
      const near = !hover || node.key === hover || drawn.touching.get(hover)?.has(node.key);
      c.globalAlpha = near ? 1 : 0.25;
      c.fillStyle = TONES[node.kind];
      const r = (node.key === drawn.centre ? 6 : 3.4) * Math.min(2, Math.sqrt(view.zoom));
      c.beginPath();
      if (node.kind === "segment") c.rect(x - r * 1.5, y - r * 0.55, r * 3, r * 1.1);
      else if (node.kind === "sign") c.rect(x - r * 0.8, y - r * 0.8, r * 1.6, r * 1.6);
      else c.arc(x, y, r, 0, 7);
      c.fill();
      if (node.key === drawn.centre) {
        c.lineWidth = 2;
        c.strokeStyle = ink;
        c.stroke();
      }
    }
    c.globalAlpha = 1;
    c.fillStyle = ink;
    c.font = "11px sans-serif";
    if (view.zoom > 2.2) {
      for (const node of drawn.nodes) {
        const [x, y] = at.get(node.key);
        if (x > -80 && y > -20 && x < width + 80 && y < height + 20) c.fillText(node.name.slice(0, 34), x + 7, y + 4);
      }
    } else {
      c.textAlign = "center";
      drawn.domains.forEach((domain, i) => {
        const angle = ((i + 0.5) / drawn.domains.length) * 2 * Math.PI - Math.PI / 2;
        const [x, y] = onScreen([Math.cos(angle) * 0.83, Math.sin(angle) * 0.83]);
        c.fillText(words[`domain_${domain}`] || domain, x, y);
      });
      c.textAlign = "start";
    }
  }

  function nearest(event) {
    const box = canvas.getBoundingClientRect();
    const [px, py] = [event.clientX - box.left, event.clientY - box.top];
    let best = null;
    let least = 12;
    for (const node of drawn ? drawn.nodes : []) {
      const [x, y] = onScreen(drawn.at.get(node.key));
      const far = Math.hypot(x - px, y - py);
      if (far < least) [best, least] = [node, far];
    }
    return { node: best, px, py };
  }

  let drag = null;
  canvas.addEventListener("pointerdown", (event) => {
    canvas.setPointerCapture(event.pointerId);
    drag = { x: event.clientX, y: event.clientY, moved: false };
  });
  canvas.addEventListener("pointermove", (event) => {
    if (drag) {
      const unit = (Math.min(board.clientWidth, canvas.clientHeight) / 2 - 12) * view.zoom;
      drag.moved ||= Math.hypot(event.clientX - drag.x, event.clientY - drag.y) > 3;
      view = { ...view, x: view.x + (event.clientX - drag.x) / unit, y: view.y + (event.clientY - drag.y) / unit };
      drag = { ...drag, x: event.clientX, y: event.clientY };
      ask();
      return;
    }
    const { node, px, py } = nearest(event);
    if ((node ? node.key : null) !== hover) {
      hover = node ? node.key : null;
      tip.hidden = !node;
      tip.textContent = node ? node.name : "";
      if (node) point(node.key);
      ask();
    }
    tip.style.transform = `translate(${px + 14}px, ${py + 10}px)`;
  });
  canvas.addEventListener("pointerup", (event) => {
    const still = drag && !drag.moved;
    drag = null;
    if (still) {
      const { node } = nearest(event);
      if (node) pick(node.key);
    }
  });
  canvas.addEventListener("pointerleave", () => {
    hover = null;
    tip.hidden = true;
    ask();
  });
  canvas.addEventListener("wheel", (event) => {
    event.preventDefault();
    view = { ...view, zoom: Math.max(0.7, Math.min(9, view.zoom * Math.exp(-event.deltaY / 600))) };
    ask();
  }, { passive: false });
  canvas.addEventListener("keydown", (event) => {
    const step = 0.12 / view.zoom;
    const moves = { ArrowLeft: [step, 0], ArrowRight: [-step, 0], ArrowUp: [0, step], ArrowDown: [0, -step] };
    if (moves[event.key]) view = { ...view, x: view.x + moves[event.key][0], y: view.y + moves[event.key][1] };
    else if (event.key === "+" || event.key === "=") view = { ...view, zoom: Math.min(9, view.zoom * 1.25) };
    else if (event.key === "-") view = { ...view, zoom: Math.max(0.7, view.zoom / 1.25) };
    else if (event.key === "0") view = { x: 0, y: 0, zoom: 1 };
    else return;
    event.preventDefault();
    ask();
  });

  function change(graph, centre, passes) {
    const nodes = [...graph.nodes.values()];
    const edges = graph.edges.filter(passes);
    const touching = new Map();
    for (const edge of edges) {
      for (const [a, b] of [[edge.a, edge.b], [edge.b, edge.a]]) touching.set(a, (touching.get(a) || new Set()).add(b));
    }
    const at = places(nodes, graph.domains);
    // What was there keeps its place, so that an edit does not move what somebody has learnt to find.
    if (drawn) for (const [key, place] of drawn.at) if (at.has(key)) at.set(key, place);
    drawn = { nodes, edges, centre, touching, domains: graph.domains, at };
    paint();
  }

  return { board, change, paint, panBy: (x) => { view = { ...view, x: view.x + x }; paint(); } };
}
