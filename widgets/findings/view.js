// Findings: every sign with what was seen of it. Not tested, absent and present stay three different things.
import { fill, frame, freshId, h, keep, mark, number, percent, say, segmented, setNumber, watch } from "../front/kit.js";
import { found, grouped } from "./search.js";

const GRADES = ["not_tested", "absent", "mild", "moderate", "severe"];

function pips(grade) {
  const full = { mild: 1, moderate: 2, severe: 3 }[grade] || 0;
  return h("span", { class: "bw-pips", "aria-hidden": "true" }, [1, 2, 3].map((i) => h("i", { class: i <= full ? "bw-on" : "" })));
}

function sideLine(sign, side, words, tell) {
  const options = GRADES.map((grade) => [grade,
    ["mild", "moderate", "severe"].includes(grade) ? [pips(grade), words[grade]] : words[grade], { title: words[`${grade}_hint`] }]);
  const label = `${sign.name}${side === "none" ? "" : `, ${words[`body_${side}`]}`}`;
  const control = segmented(label, options, "not_tested", (grade) => tell({ grade }));
  const expected = number(), plain = number();
  const hope = h("span", { class: "bw-find-expected bw-soft", title: words.expected_hint },
    words.expected, " ", expected, " · ", words.expected_plain, " ", plain);
  const node = h("div", { class: "bw-find-line" },
    side === "none" ? null : h("span", { class: "bw-find-side" }, words[`body_${side}`]), control, hope);
  node.change = (finding, chance, id) => {
    const grade = finding ? finding.grade : "not_tested";
    control.show(grade);
    mark(node, "data-grade", grade);
    hope.hidden = !chance;
    if (chance) {
      setNumber(expected, `signs/${id}/expected`, chance[0], percent(chance[0]));
      setNumber(plain, `signs/${id}/expected_cortical`, chance[1], percent(chance[1]));
    }
  };
  return node;
}

function fact(term, ...value) {
  return h("div", {}, h("dt", {}, term), h("dd", {}, ...value));
}

function details(sign, words) {
  const list = h("dl", { class: "bw-facts" },
    fact(words.takes, fill(words.minutes, { minutes: sign.minutes })),
    fact(words.accuracy,
      number(`graph/signs/${sign.key}/sensitivity`, sign.sensitivity, percent(sign.sensitivity)), ` ${words.sensitivity}, `,
      number(`graph/signs/${sign.key}/specificity`, sign.specificity, percent(sign.specificity)), ` ${words.specificity}`),
    fact(words.accuracy_from, sign.accuracy_source === "memory" ? words.from_memory : sign.accuracy_source),
    sign.hpo ? fact("HPO", `${sign.hpo} ${sign.hpo_label}`) : null,
    sign.note ? fact(words.note, sign.note) : null);
  return h("details", { class: "bw-find-more" },
    h("summary", {}, words.how_to_examine), h("p", {}, sign.examination), list);
}

/** How, when and by whom a finding was made; shown for what is recorded. */
function circumstances(sign, side, words, tell) {
  const inputs = ["test", "date", "by"].map((name) => {
    const id = freshId(name);
    const input = h("input", { id, class: "bw-search", type: name === "date" ? "date" : "text", maxlength: 120, onchange: () => tell({ [name]: input.value.trim() || null }) });
    return { name, input, node: h("span", { class: "bw-find-how" }, h("label", { for: id, class: "bw-soft" }, words[`how_${name}`]), input) };
  });
  const node = h("div", { class: "bw-find-hows" }, side === "none" ? null : h("span", { class: "bw-find-side" }, words[`body_${side}`]), inputs.map((each) => each.node));
  node.change = (finding) => {
    node.hidden = !finding;
    for (const { name, input } of inputs) if (document.activeElement !== input) input.value = (finding && finding[name]) || "";
  };
  return node;
}

function makeSign(sign, words, tell) {
  const lines = new Map(sign.sides.map((side) => [side, sideLine(sign, side, words, (what) => tell(sign.key, side, what))]));
  const hows = new Map(sign.sides.map((side) => [side, circumstances(sign, side, words, (what) => tell(sign.key, side, what))]));
  const more = details(sign, words);
  more.append(...hows.values());
  const node = h("li", { class: "bw-find-sign", "data-sign": sign.key },
    h("div", { class: "bw-find-name" }, sign.name), [...lines.values()], more);
  node.change = (findings, expected, onlyRecorded) => {
    for (const [side, line] of lines) {
      const id = `${sign.key}@${side}`;
      line.change(findings[id], expected[id], id);
      hows.get(side).change(findings[id]);
      line.hidden = onlyRecorded && !findings[id];
    }
  };
  return node;
}

function makeGroup(group) {
  const count = h("span", { class: "bw-soft" });
  const list = h("ul", { class: "bw-find-list" });
  const node = h("details", { class: "bw-find-group", "data-domain": group.domain },
    h("summary", {}, h("span", {}, group.name), " ", count), list);
  return Object.assign(node, { list, count });
}

function render({ model, el }) {
  const words = model.get("words");
  const view = { show: Object.keys(model.get("findings")).length ? "recorded" : "all", text: "" };
  let kept = new Set(Object.keys(model.get("findings"))); // signs stay in place until the list is asked for anew
  const choose = segmented(words.show_label, [["recorded", words.recorded], ["all", words.all]], view.show, (show) => {
    view.show = show;
    kept = new Set(Object.keys(model.get("findings")));
    draw();
  });
  const search = h("input", { class: "bw-search", type: "search", placeholder: words.search, "aria-label": words.search,
    oninput: () => { view.text = search.value.trim(); draw(); } });
  const { panel, body, foot } = frame(el, words, "findings", choose, search);
  const groups = h("div", { class: "bw-find-groups" });
  const empty = h("p", { class: "bw-empty" });
  body.append(groups, empty);
  const tally = h("p", { role: "status" });
  foot.append(tally);

  function tell(sign, side, what) {
    const id = `${sign}@${side}`;
    kept.add(id);
    const findings = { ...model.get("findings") };
    if (what.grade === "not_tested") delete findings[id];
    else if (what.grade || findings[id]) findings[id] = { ...(findings[id] || {}), ...what };
    if (what.grade || findings[id]) model.send({ kind: "finding", sign, side, grade: findings[id] ? findings[id].grade : "not_tested", ...what });
    draw(findings);
  }

  function draw(now) {
    const findings = now && !now.type ? now : model.get("findings");
    const recorded = view.show === "recorded" && !view.text;
    for (const id of Object.keys(findings)) kept.add(id);
    const signs = view.text ? found(model.get("signs"), view.text, model.get("everyday"), words)
      : model.get("signs").filter((sign) => !recorded || sign.sides.some((side) => kept.has(`${sign.key}@${side}`)));
    const expected = model.get("expected");
    const shown = recorded ? Object.fromEntries([...kept].map((id) => [id, findings[id] || {}])) : findings;
    keep(groups, grouped(signs, words), (group) => group.domain, makeGroup, (node, group) => {
      keep(node.list, group.signs, (sign) => sign.key, (sign) => makeSign(sign, words, tell), (item, sign) => {
        item.change(findings, expected, false);
        for (const [i, side] of sign.sides.entries()) item.children[1 + i].hidden = recorded && !shown[`${sign.key}@${side}`];
      });
      const seen = group.signs.flatMap((sign) => sign.sides.filter((side) => findings[`${sign.key}@${side}`])).length;
      say(node.count, recorded || !seen ? "" : fill(words.of_recorded, { count: seen }));
      if (recorded || view.text) node.open = true;
      else if (node.$was !== view.show) node.open = seen > 0;
      node.$was = recorded || view.text ? "forced" : view.show;
    });
    empty.hidden = signs.length > 0;
    say(empty, view.text ? fill(words.nothing_found, { text: view.text }) : words.nothing_recorded);
    const grades = Object.values(findings).map((finding) => finding.grade);
    const absent = grades.filter((grade) => grade === "absent").length;
    say(tally, fill(words.tally, { present: grades.length - absent, absent }));
    mark(panel, "data-stamp", model.get("stamp"));
  }

  return watch(model, ["signs", "findings", "expected", "stamp"], draw);
}

export default { render };
