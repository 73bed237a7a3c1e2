// Which signs a search finds, in which order, and how they are grouped.

const LETTERS = /[^\p{L}\p{N}]+/u;
const INSIDE = 8;

/** Lower case, words parted by single spaces, one in front; British and American spellings meet ("aesth", "esth"). */
function flat(text) {
  return ` ${String(text || "").toLowerCase().split(LETTERS).filter(Boolean).join(" ")}`.replaceAll("ae", "e");
}

/** The same, and once more without "hemi-", so that "paresis" begins a word of "hemiparesis". */
function named(text) {
  const whole = flat(text);
  return [whole, whole.replace(/ hemi(?=\p{L}{3})/gu, " ")];
}

const begins = (texts, term) => texts.some((text) => text.includes(term));
const opens = (texts, term) => texts.some((text) => text.startsWith(term));

/** The clinic's terms for an everyday word, also while it is being typed (three letters or more). */
function terms(word, everyday) {
  if (word.length < 4) return []; // the space in front counts
  const known = Object.keys(everyday).filter((each) => flat(each).startsWith(word));
  return Object.assign(known.flatMap((each) => everyday[each]).map(flat), { whole: known.some((each) => flat(each) === word) });
}

function readable(sign, words) {
  return {
    name: named(sign.name), key: named(sign.key), domain: [flat(sign.domain), flat(words[`domain_${sign.domain}`])],
    rest: [sign.examination, sign.hpo_label, sign.hpo].map((each) => `${flat(each)} `),
  };
}

/** How well one word fits a sign: 0 best, Infinity not at all. */
function fit(text, word, synonyms, inside) {
  if (opens(text.name, word)) return 0;
  if (synonyms.length && opens(text.name, synonyms[0])) return 0.5;
  if (synonyms.length && begins(text.name, synonyms[0])) return 1;
  if (begins(text.name, word)) return 2;
  if (synonyms.some((term) => begins(text.name, term))) return 3;
  if (begins(text.key, word)) return 4;
  if (synonyms.some((term) => begins(text.key, term))) return 5;
  if ([word, ...synonyms].some((term) => begins(text.domain, term))) return 6;
  // A whole everyday word is meant as it stands in running text: "numb" is not "numbers".
  if (begins(text.rest, synonyms.whole ? `${word} ` : word)) return 7;
  return inside && Object.values(text).some((texts) => begins(texts, word.trim())) ? INSIDE : Infinity;
}

/** Signs that fit every word typed, best first; letters inside a word count only where nothing else fits. */
export function found(signs, typed, everyday, words) {
  const asked = flat(typed).split(" ").filter(Boolean).map((word) => ` ${word}`);
  if (!asked.length) return [];
  const synonyms = asked.map((word) => terms(word, everyday));
  const texts = signs.map((sign) => readable(sign, words));
  for (const inside of [false, true]) {
    const ranked = signs.map((sign, i) => ({ sign, fit: asked.reduce((sum, word, n) => sum + fit(texts[i], word, synonyms[n], inside), 0) }))
      .filter((each) => each.fit < Infinity).sort((a, b) => a.fit - b.fit);
    if (ranked.length) return ranked.map((each) => each.sign);
  }
  return [];
}

/** Signs by domain, in the order in which the domains first occur. */
export function grouped(signs, words) {
  const groups = new Map();
  for (const sign of signs) {
    if (!groups.has(sign.domain)) groups.set(sign.domain, { domain: sign.domain, name: words[`domain_${sign.domain}`] || sign.domain, signs: [] });
    groups.get(sign.domain).signs.push(sign);
  }
  return [...groups.values()];
}
