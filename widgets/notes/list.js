// Notes in threads or by time, with what each is about, and what can be done with it.
import { fill, freshId, h, keep, mark, say } from "../front/kit.js";
import { makeForm } from "./compose.js";
import { prose } from "./safe.js";

function when(time) {
  return time.replace("T", " ").replace(/:\d\d(?:\+00:00|Z)$/, " UTC");
}

function anchorChip(anchor, words, tell) {
  if (anchor.kind === "case") return null;
  return h("button", { type: "button", class: "bw-chip bw-note-anchor", "data-kind": anchor.kind, title: `${words.open_anchor}: ${words[`kind_${anchor.kind}`]}`,
    onclick: () => tell({ kind: "open", anchor: { kind: anchor.kind, key: anchor.key, mm: anchor.mm } }) },
  h("span", { class: "bw-soft" }, words[`kind_${anchor.kind}`]), h("span", { class: "bw-note-place" }, anchor.label));
}

function makeNote(note, words, tell, forms) {
  const place = h("div", {});
  const body = h("div", {});
  const acts = h("div", { class: "bw-note-acts" });
  const head = h("div", { class: "bw-note-head" });
  const node = h("article", { class: "bw-note", "data-note": note.id }, head, body, acts, place);

  function ask(kind, start, more) {
    const shut = () => {
      place.replaceChildren();
      forms.delete(form);
    };
    const form = makeForm(words, (fields) => {
      tell({ kind: "write", ...fields, ...more });
      shut();
    }, { about: false, start, put: words[kind], cancel: shut });
    forms.add(form);
    place.replaceChildren(form);
    form.focus();
  }

  node.change = (now, mine) => {
    node.style.setProperty("--depth", Math.min(now.depth, 6));
    mark(node, "data-settled", now.settled ? "true" : null);
    const shown = JSON.stringify([now, mine]);
    if (node.$shown === shown) return;
    node.$shown = shown;
    head.replaceChildren(...[h("strong", {}, now.author), h("time", { class: "bw-soft", datetime: now.time }, when(now.time)),
      anchorChip(now.anchor, words, tell), ...now.tags.map((tag) => h("span", { class: "bw-tag" }, tag)),
      now.mentions.length ? h("span", { class: "bw-soft" }, `${words.mentions} ${now.mentions.join(", ")}`) : null,
      now.edited ? h("span", { class: "bw-tag" }, words.edited) : null,
      now.settled ? h("span", { class: "bw-tag bw-note-settled" }, words.settled) : null].filter(Boolean));
    body.replaceChildren(prose(now.html));
    const inherit = { anchor: { kind: now.anchor.kind, key: now.anchor.key, mm: now.anchor.mm } };
    acts.replaceChildren(...[
      h("button", { type: "button", class: "bw-link", onclick: () => ask("answer", {}, { reply_to: now.id, ...inherit }) }, words.answer),
      now.author === mine ? h("button", { type: "button", class: "bw-link", onclick: () => ask("edit", now,
        { replaces: now.id, reply_to: now.reply_to, ...inherit }) }, words.edit) : null,
      h("button", { type: "button", class: "bw-link", onclick: () => tell({ kind: "settle", note: now.first, settled: !now.settled }) },
        now.settled ? words.reopen : words.settle)].filter(Boolean));
  };
  return node;
}

function makeRival(group, words, tell) {
  return h("div", { class: "bw-rival" }, group.map((page) => h("div", { class: "bw-rival-side", "data-page": page.id },
    h("div", { class: "bw-note-head" }, h("strong", {}, page.author), h("time", { class: "bw-soft" }, when(page.time))), prose(page.html),
    h("button", { type: "button", class: "bw-button", onclick: () => tell({ kind: "keep", page: page.id }) }, words.keep_this))));
}

function chooser(label, change) {
  const id = freshId("filter");
  const select = h("select", { id, onchange: change });
  const node = h("span", {}, h("label", { for: id, class: "bw-hidden-text" }, label), select);
  node.value = () => select.value;
  node.offer = (rows) => {
    const shown = JSON.stringify(rows);
    if (node.$shown === shown) return;
    node.$shown = shown;
    const was = select.value;
    select.replaceChildren(h("option", { value: "" }, label), ...rows.map(([value, text]) => h("option", { value }, text)));
    if (rows.some(([value]) => value === was)) select.value = was;
  };
  return node;
}

/** The notes view; `change(told, here, places, mine)` brings it up to date, `shown()` lists the ids that pass the filter. */
export function makeNotes(words, tell) {
  const forms = new Set();
  const redraw = () => draw();
  const write = makeForm(words, (fields) => {
    tell({ kind: "write", ...fields });
    write.clear();
  });
  const author = chooser(words.any_author, redraw);
  const tag = chooser(words.any_tag, redraw);
  const kind = chooser(words.any_kind, redraw);
  const openOnly = h("input", { type: "checkbox", onchange: redraw });
  const orderId = freshId("order");
  const order = h("select", { id: orderId, onchange: redraw }, ["threads", "time"].map((value) => h("option", { value }, words[`order_${value}`])));
  const count = h("span", { class: "bw-soft", role: "status" });
  const report = h("button", { type: "button", class: "bw-button", title: words.report_hint, onclick: () => tell({ kind: "report", notes: passing().map((note) => note.id) }) }, words.report);
  const list = h("div", { class: "bw-notes-list" });
  const empty = h("p", { class: "bw-empty" });
  const rivals = h("section", { class: "bw-rivals", "aria-label": words.rivals });
  const broken = h("div", { class: "bw-soft" });
  const node = h("div", {}, write, rivals,
    h("div", { class: "bw-notes-bar" }, author, tag, kind, h("label", { class: "bw-check" }, openOnly, ` ${words.open_only}`),
      h("label", { for: orderId, class: "bw-hidden-text" }, words.order), order, count, report), list, empty, broken);
  let told = { notes: [] };
  let mine = "";

  function passing() {
    return told.notes.filter((note) => (!author.value() || note.author === author.value()) && (!tag.value() || note.tags.includes(tag.value()))
      && (!kind.value() || note.anchor.kind === kind.value()) && (!openOnly.checked || !note.settled));
  }

  function draw() {
    const notes = passing();
    const flat = order.value === "time" || notes.length < told.notes.length;
    const rows = order.value === "time" ? [...notes].sort((a, b) => (a.time < b.time ? 1 : a.time > b.time ? -1 : 0)) : notes;
    keep(list, rows, (note) => note.id, (note) => makeNote(note, words, tell, forms), (item, note) => item.change(flat ? { ...note, depth: 0 } : note, mine));
    say(count, fill(words.count, { shown: notes.length, all: told.notes.length }));
    empty.hidden = notes.length > 0;
    say(empty, told.notes.length ? words.nothing_matches : words.nothing);
  }

  function change(now, here, places, me) {
    told = now;
    mine = me;
    write.change(here, places);
    author.offer(now.authors.map((name) => [name, name]));
    tag.offer(now.tags.map((name) => [name, name]));
    kind.offer(now.kinds.map((name) => [name, words[`kind_${name}`] || name]));
    rivals.hidden = now.rivals.length === 0;
    const shown = JSON.stringify(now.rivals);
    if (rivals.$shown !== shown) {
      rivals.$shown = shown;
      rivals.replaceChildren(h("h3", {}, words.rivals), h("p", { class: "bw-soft" }, words.rivals_hint), ...now.rivals.map((group) => makeRival(group, words, tell)));
    }
    broken.hidden = now.unreadable.length === 0;
    broken.replaceChildren(h("p", {}, words.unreadable), h("ul", {}, now.unreadable.map((line) => h("li", {}, line))));
    draw();
  }

  return { node, change };
}
