// Along the course: the chart of one segment, a sentence that says the same, and the numbers as a table.
import { fill, fixed, frame, glyph, h, mark, number, percent, say, selector, watch } from "../front/kit.js";
import { axes, chart, sample } from "./chart.js";

/** A sentence of the table of words with numbers that name themselves. */
function sentence(course, words) {
  const { id, ends, facts } = course;
  const node = (fact, text) => number(`along/${id}/${fact}`, facts[fact], text);
  const parts = {
    start: () => node("hit_from_start_mm", fixed(facts.hit_from_start_mm, 0)),
    end: () => node("hit_from_end_mm", fixed(facts.hit_from_end_mm, 0)),
    length: () => node("length_mm", fixed(facts.length_mm, 0)),
    share: () => node("peak_share", percent(facts.peak_share)),
    peak: () => node("peak_from_start_mm", fixed(facts.peak_from_start_mm, 0)),
    first: () => ends[0],
    last: () => ends[1],
  };
  const text = facts.peak_share > 0 ? words.hit_between : words.not_hit;
  return text.split(/(\{\w+\})/).map((piece) => (piece.startsWith("{") ? parts[piece.slice(1, -1)]() : piece));
}

function table(course, words) {
  const { id, ends, bins } = course;
  const head = [fill(words.from_start, { place: ends[0] }), fill(words.from_end, { place: ends[1] }), words.share_hit, words.mean_effect, words.streamlines];
  const cells = [["from_start_mm", (v) => fixed(v, 1)], ["from_end_mm", (v) => fixed(v, 1)], ["share_hit", percent], ["mean_effect", percent], ["streamlines", (v) => fixed(v, 0)]];
  return h("table", { class: "bw-along-table" },
    h("thead", {}, h("tr", {}, head.map((text) => h("th", { scope: "col" }, text)))),
    h("tbody", {}, bins.from_start_mm.map((_, i) => h("tr", {}, cells.map(([column, show]) =>
      h("td", {}, number(`along/${id}/bins/${i}/${column}`, bins[column][i], show(bins[column][i]))))))));
}

function render({ model, el }) {
  const words = model.get("words");
  const choose = h("select", { "aria-label": words.choose, onchange: () => selector(model)(choose.value) });
  const { panel, body, foot } = frame(el, words, "along", choose);
  const name = h("h3", { class: "bw-along-name" });
  const told = h("p", { class: "bw-along-told", "aria-live": "polite" });
  const whose = h("p", { class: "bw-soft" });
  const above = h("div", {}), stage = h("div", { class: "bw-along-stage" }), below = h("div", {});
  const usual = h("span", {}, sample("usual"), ` ${words.usual_hit}`);
  const key = h("p", { class: "bw-along-key bw-soft" }, h("span", {}, sample("hit"), ` ${words.share_hit}`), h("span", {}, sample("mean"), ` ${words.mean_effect}`), usual);
  const rows = h("div", {});
  const more = h("details", {}, h("summary", {}, words.table), rows);
  const shown = h("div", {}, name, told, whose, above, stage, below, key, more);
  const empty = h("p", { class: "bw-empty" }, words.nothing);
  body.append(shown, empty);
  foot.append(h("p", {}, words.how));
  let width = 0;

  function drawTable() {
    const course = model.get("course");
    rows.replaceChildren(...(more.open && course.id ? [table(course, words)] : []));
  }
  more.addEventListener("toggle", drawTable);

  function draw() {
    const course = model.get("course");
    const listed = model.get("choices");
    const all = listed.some((item) => item.id === course.id) || !course.id ? listed : [course, ...listed];
    choose.replaceChildren(...all.map((item) => h("option", { value: item.id }, `${item.name}, ${words[item.side]}`)));
    choose.hidden = all.length === 0;
    shown.hidden = !course.id;
    empty.hidden = Boolean(course.id);
    mark(panel, "data-stamp", model.get("stamp"));
    if (!course.id) return;
    choose.value = course.id;
    const title = `${course.name}, ${words[course.side]}`;
    name.replaceChildren(glyph("segment"), ` ${title}`);
    told.replaceChildren(...sentence(course, words));
    say(whose, fill(words.whose, { whose: course.anatomy === "template" ? words.template_anatomy : course.anatomy }));
    const [top, bottom] = axes(words, course.ends, fill);
    above.replaceChildren(top);
    below.replaceChildren(bottom);
    width = Math.max(320, Math.floor(stage.clientWidth || 800));
    stage.replaceChildren(chart(course, fill(words.chart, { name: title }), width));
    usual.hidden = !course.usual;
    drawTable();
  }

  const sized = new ResizeObserver(() => {
    if (stage.clientWidth > 0 && Math.abs(stage.clientWidth - width) > 1 && stage.clientWidth >= 320) draw();
  });
  sized.observe(stage);
  const stop = watch(model, ["course", "choices", "stamp"], draw);
  return () => {
    sized.disconnect();
    stop();
  };
}

export default { render };
