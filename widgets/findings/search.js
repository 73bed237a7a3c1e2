// Which signs a search finds, and how they are grouped.

/** Whether every word typed occurs in the sign's name, key, domain, examination or term id. */
export function matches(sign, text) {
  const hay = `${sign.name} ${sign.key} ${sign.domain} ${sign.examination} ${sign.hpo || ""} ${sign.hpo_label || ""}`.toLowerCase();
  return text.trim().toLowerCase().split(/\s+/).every((word) => hay.includes(word));
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
