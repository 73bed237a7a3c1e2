// Three planes of the template on which waypoints are set and dragged, with the course drawn through them.
import { fill, h, mark } from "../front/kit.js";

const PLANES = {
  sagittal: { across: 1, up: 2, through: 0 },
  coronal: { across: 0, up: 2, through: 1 },
  axial: { across: 0, up: 1, through: 2 },
};
const NEAR_PX = 11;
const GREY = 0.86;

/** Shortest distance from a point to a piece of line, in mm. */
function away(p, a, b) {
  const d = a.map((x, i) => b[i] - x);
  const length = d.reduce((sum, x) => sum + x * x, 0);
  const t = length ? Math.max(0, Math.min(1, d.reduce((sum, x, i) => sum + x * (p[i] - a[i]), 0) / length)) : 0;
  return Math.hypot(...d.map((x, i) => a[i] + t * x - p[i]));
}

/** Where a new point belongs in the order of travel: between the two nearest, or at the end that it prolongs. */
export function placeFor(points, p) {
  if (points.length < 2) return points.length;
  let best = points.length;
  let least = Infinity;
  for (let i = 1; i < points.length; i += 1) {
    const far = away(p, points[i - 1], points[i]);
    if (far < least) [best, least] = [i, far];
  }
  const ends = [Math.hypot(...p.map((x, i) => x - points[0][i])), Math.hypot(...p.map((x, i) => x - points[points.length - 1][i]))];
  if (ends[0] <= least + 1e-9) return 0;
  if (ends[1] <= least + 1e-9) return points.length;
  return best;
}

/** `change(points)` when points move (`done` false while a drag goes on); `ask()` asks the kernel for the slices. */
export function makeLightbox(words, { change, choose, look, ask, ordered = true }) {
  let points = [];
  let chosen = -1;
  let focus = [0, 0, 0];
  let slices = null;
  let course = null;
  const films = Object.entries(PLANES).map(([name, plane]) => makeFilm(name, plane));
  const node = h("div", { class: "be-lightbox" }, films.map((film) => film.node));
  let asked = false;

  function makeFilm(name, plane) {
    const canvas = h("canvas", { class: "be-film", tabindex: "0", role: "application", "data-plane": name,
      "aria-label": fill(words.plane_label, { plane: words[`plane_${name}`] }) });
    const figure = h("figure", { class: "be-film-box" }, canvas, h("figcaption", {}, words[`plane_${name}`], h("span", { class: "be-film-at bw-soft" })));
    return { node: figure, canvas, plane, name, at: figure.querySelector(".be-film-at"), held: null };
  }
  const span = (axis) => (slices ? (slices.shape[axis] - 1) * slices.step : 180);
  const low = (axis) => (slices ? slices.low[axis] : -90);

  /** From mm in the plane to pixels of the canvas, and back. Radiological: the left of the brain is on the right; the front is on the left. */
  function view(film) {
    const { canvas, plane } = film;
    const scale = Math.min(canvas.width / span(plane.across), canvas.height / span(plane.up));
    const x0 = (canvas.width - span(plane.across) * scale) / 2;
    const y0 = (canvas.height - span(plane.up) * scale) / 2;
    return {
      scale,
      to: (p) => {
        const across = p[plane.across] - low(plane.across);
        return [x0 + (span(plane.across) - across) * scale, canvas.height - y0 - (p[plane.up] - low(plane.up)) * scale];
      },
      from: (x, y) => {
        const across = (x - x0) / scale;
        const p = [...focus];
        p[plane.across] = low(plane.across) + span(plane.across) - across;
        p[plane.up] = low(plane.up) + (canvas.height - y0 - y) / scale;
        return p.map((v) => Math.round(v * 2) / 2);
      },
    };
  }

  function background(film, ctx) {
    const { plane } = film;
    if (!slices) return;
    const [w, hgt] = [slices.shape[plane.across], slices.shape[plane.up]];
    const n = Math.max(0, Math.min(slices.shape[plane.through] - 1, Math.round((focus[plane.through] - low(plane.through)) / slices.step)));
    if (!film.sheet || film.sheet.n !== n) {
      const canvas = document.createElement("canvas");
      [canvas.width, canvas.height] = [w, hgt];
      const c = canvas.getContext("2d");
      const image = c.createImageData(w, hgt);
      const stride = [slices.shape[1] * slices.shape[2], slices.shape[2], 1];
      for (let v = 0; v < hgt; v += 1) {
        for (let u = 0; u < w; u += 1) {
          const across = w - 1 - u;
          const value = slices.data[n * stride[plane.through] + across * stride[plane.across] + (hgt - 1 - v) * stride[plane.up]] * GREY;
          const p = (v * w + u) * 4;
          image.data[p] = image.data[p + 1] = image.data[p + 2] = value;
          image.data[p + 3] = 255;
        }
      }
      c.putImageData(image, 0, 0);
      film.sheet = { n, canvas };
    }
    const { scale } = view(film);
    const [width, height] = [w * slices.step * scale, hgt * slices.step * scale];
    ctx.imageSmoothingQuality = "high";
    ctx.drawImage(film.sheet.canvas, (film.canvas.width - width) / 2, (film.canvas.height - height) / 2, width, height);
  }

  function strand(ctx, to, data, first, last) {
    ctx.moveTo(...to([data[3 * first], data[3 * first + 1], data[3 * first + 2]]));
    for (let i = first + 1; i < last; i += 1) ctx.lineTo(...to([data[3 * i], data[3 * i + 1], data[3 * i + 2]]));
  }

  function paintFilm(film) {
    const ratio = window.devicePixelRatio || 1;
    const width = Math.round((film.canvas.clientWidth || 220) * ratio);
    if (film.canvas.width !== width) [film.canvas.width, film.canvas.height] = [width, width];
    const ctx = film.canvas.getContext("2d");
    ctx.fillStyle = "#000";
    ctx.fillRect(0, 0, film.canvas.width, film.canvas.height);
    background(film, ctx);
    const { to, scale } = view(film);
    const { plane } = film;
    if (course && course.points) {
      ctx.strokeStyle = "rgba(230, 159, 0, 0.34)";
      ctx.lineWidth = ratio;
      ctx.beginPath();
      for (let n = 1; n < course.offsets.length; n += 1) strand(ctx, to, course.points, course.offsets[n - 1], course.offsets[n]);
      ctx.stroke();
    }
    if (points.length > 1 && ordered) {
      ctx.strokeStyle = "rgba(255, 255, 255, 0.5)";
      ctx.setLineDash([3 * ratio, 4 * ratio]);
      ctx.lineWidth = ratio;
      ctx.beginPath();
      points.forEach((p, i) => (i ? ctx.lineTo(...to(p)) : ctx.moveTo(...to(p))));
      ctx.stroke();
      ctx.setLineDash([]);
    }
    if (course && course.line) {
      ctx.strokeStyle = "#f0e442";
      ctx.lineWidth = 2 * ratio;
      ctx.beginPath();
      strand(ctx, to, course.line, 0, course.line.length / 3);
      ctx.stroke();
    }
    points.forEach((p, i) => {
      const [x, y] = to(p);
      const far = Math.abs(p[plane.through] - focus[plane.through]);
      ctx.globalAlpha = far > 12 ? 0.45 : 1;
      ctx.beginPath();
      ctx.arc(x, y, (i === chosen ? 7 : 5.5) * ratio, 0, 7);
      ctx.fillStyle = i === chosen ? "#fff" : "#e69f00";
      ctx.fill();
      ctx.lineWidth = 1.5 * ratio;
      ctx.strokeStyle = "#1c1300";
      ctx.stroke();
      ctx.fillStyle = "#1c1300";
      ctx.font = `600 ${8.5 * ratio}px system-ui, sans-serif`;
      ctx.textAlign = "center";
      ctx.textBaseline = "middle";
      ctx.fillText(String(i + 1), x, y + 0.5 * ratio);
      ctx.globalAlpha = 1;
    });
    ctx.fillStyle = "#dfe3e8";
    ctx.font = `600 ${11 * ratio}px system-ui, sans-serif`;
    ctx.textBaseline = "top";
    const marks = plane.across === 1 ? [words.front_mark, words.back_mark] : [words.right_mark, words.left_mark];
    ctx.textAlign = "left";
    ctx.fillText(marks[0], 6 * ratio, 6 * ratio);
    ctx.textAlign = "right";
    ctx.fillText(marks[1], film.canvas.width - 6 * ratio, 6 * ratio);
    film.at.textContent = ` ${"xyz"[plane.through]} = ${Math.round(focus[plane.through])} mm`;
    mark(film.canvas, "data-scale", (scale / ratio).toFixed(4));
  }

  function paint() {
    if (asked) return;
    asked = true;
    requestAnimationFrame(() => {
      asked = false;
      if (!slices && node.isConnected) ask();
      films.forEach(paintFilm);
    });
  }

  function select(n, from = null) {
    chosen = n;
    if (n >= 0 && points[n]) {
      const kept = from ? focus[from.plane.through] : null;
      focus = [...points[n]];
      if (from && kept !== null) focus[from.plane.through] = points[n][from.plane.through];
    }
    choose(n);
    paint();
  }

  function add(p) {
    const place = ordered ? placeFor(points, p) : points.length;
    points = [...points.slice(0, place), p, ...points.slice(place)];
    select(place);
    change(points, true);
  }
  function moved(n, p, done) {
    points = points.map((each, i) => (i === n ? p : each));
    change(points, done);
    paint();
  }

  for (const film of films) {
    const { canvas, plane } = film;
    const spot = (event) => {
      const box = canvas.getBoundingClientRect();
      const ratio = canvas.width / box.width;
      return [(event.clientX - box.left) * ratio, (event.clientY - box.top) * ratio, ratio];
    };
    canvas.addEventListener("pointerdown", (event) => {
      canvas.setPointerCapture(event.pointerId);
      const [x, y, ratio] = spot(event);
      const { to, from } = view(film);
      const found = points.map((p, i) => [Math.hypot(to(p)[0] - x, to(p)[1] - y), i]).filter(([d]) => d < NEAR_PX * ratio)
        .sort((a, b) => a[0] - b[0])[0];
      if (found) {
        select(found[1], film);
        film.held = { n: found[1], moved: false };
      } else {
        add(from(x, y));
        film.held = { n: chosen, moved: false };
      }
      event.preventDefault();
      canvas.focus();
    });
    canvas.addEventListener("pointermove", (event) => {
      if (!film.held) return;
      const [x, y] = spot(event);
      const p = view(film).from(x, y);
      const old = points[film.held.n];
      p[plane.through] = old[plane.through];
      if (p.every((v, i) => v === old[i])) return;
      film.held.moved = true;
      moved(film.held.n, p, false);
    });
    canvas.addEventListener("pointerup", () => {
      const { held } = film;
      film.held = null;
      if (held && held.moved) {
        select(held.n, film);
        change(points, true);
      }
    });
    canvas.addEventListener("pointercancel", () => { film.held = null; });
    canvas.addEventListener("wheel", (event) => {
      event.preventDefault();
      focus = focus.map((v, i) => (i === plane.through ? v + Math.sign(event.deltaY) * -2 : v));
      paint();
    }, { passive: false });
    canvas.addEventListener("keydown", (event) => {
      const size = event.shiftKey ? 5 : 1;
      const steps = { ArrowLeft: [plane.across, size], ArrowRight: [plane.across, -size], ArrowUp: [plane.up, size],
        ArrowDown: [plane.up, -size], PageUp: [plane.through, size], PageDown: [plane.through, -size] };
      if (steps[event.key]) {
        const [axis, by] = steps[event.key];
        if (points[chosen]) {
          const p = points[chosen].map((v, i) => (i === axis ? v + by : v));
          focus = [...p];
          moved(chosen, p, true);
        } else {
          focus = focus.map((v, i) => (i === axis ? v + by : v));
          paint();
        }
      } else if (event.key === "n" || event.key === "N") {
        if (points.length) select((chosen + 1) % points.length);
      } else if (event.key === "Insert" || event.key === "i") {
        const next = points[chosen + 1];
        if (ordered && chosen >= 0 && next) {
          points = [...points.slice(0, chosen + 1), points[chosen].map((v, i) => Math.round(v + next[i]) / 2), ...points.slice(chosen + 1)];
          select(chosen + 1);
          change(points, true);
        } else add([...focus]);
      }
      else if ((event.key === "Delete" || event.key === "Backspace") && points[chosen]) {
        const gone = chosen;
        points = points.filter((_, i) => i !== gone);
        select(Math.min(gone, points.length - 1));
        change(points, true);
      } else return;
      event.preventDefault();
    });
  }
  const seen = new ResizeObserver(paint);
  films.forEach((film) => seen.observe(film.canvas));

  return {
    node, paint, add, select,
    setPoints: (now) => {
      points = now.map((p) => [...p]);
      if (chosen >= points.length) chosen = points.length - 1;
      if (chosen < 0 && points.length) focus = [0, 1, 2].map((axis) => Math.round(points.reduce((sum, p) => sum + p[axis], 0) / points.length));
      paint();
    },
    setCourse: (now) => {
      course = now;
      paint();
    },
    setSlices: (now) => {
      slices = now;
      films.forEach((film) => { film.sheet = null; });
      paint();
    },
    setFocus: (mm) => {
      focus = [...mm];
      paint();
    },
    chosen: () => chosen,
    goThere: () => points[chosen] && look(points[chosen]),
    stop: () => seen.disconnect(),
  };
}
