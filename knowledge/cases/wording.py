"""An explanation in plain text, for the command line: the same numbers and names as everywhere else."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable

from byway.knowledge.cases.case import Case
from byway.knowledge.reasoning.accounts import Account
from byway.knowledge.reasoning.explain import Explanation
from byway.knowledge.words import word

__all__ = ["anatomy_words", "explanation_text", "whose_words"]

SHOWN_ACCOUNTS = 4
SHOWN_ROWS = 8
SHOWN_SCANS = 3


def anatomy_words(explanation: Explanation) -> str:
    """Whose anatomy the damage rests on, in words."""
    return whose_words(explanation.damage["anatomy"]) if "anatomy" in explanation.damage else "not stated"


def whose_words(anatomy: Iterable[str]) -> str:
    """Whose anatomy elements rest on, and how many on each own one.

    >>> whose_words(["template", "P-07", "template"])
    "P-07 (1 element) and the template's, not this person's (2 elements)"
    """
    count = Counter(anatomy)
    usual = count.pop("template", 0)
    words = [f"{name} ({_elements(n)})" for name, n in sorted(count.items())]
    if usual:
        words.append("the template's, not this person's" + (f" ({_elements(usual)})" if count else ""))
    return " and ".join(words) or "not stated"


def _elements(count: int) -> str:
    return f"{count} element{'s' if count != 1 else ''}"


def explanation_text(case: Case, explanation: Explanation) -> str:
    """The case, what is hit, the leading accounts and what to test next, as lines of text."""
    spec, lines = case.spec, []
    lines += [spec.title or case.folder.name, "=" * len(spec.title or case.folder.name)]
    if spec.invented:
        lines.append("Invented data.")
    lines.append(f"{spec.stage} {spec.cause}; handedness {spec.person.handedness}; "
                 f"lesion {case.lesion.volume_ml:.1f} ml; "
                 f"uncharted_share {explanation.uncharted_share:.2f}")  # fmt: skip
    lines += [f"note: {note}" for note in case.lesion.notes]
    lines += ["", "What is hit", "-----------"]
    hit = explanation.damage[explanation.damage["share"] >= 0.02].head(SHOWN_ROWS)
    for row in hit.itertuples():
        measure = "lost" if row.kind == "region" else "severed"
        whose = "" if row.anatomy == "template" else f", by {row.anatomy}"
        lines.append(f"  {row.share:5.2f} ({row.low:.2f}-{row.high:.2f}) {measure:8} {row.name}, {row.side} "
                     f"[{row.element}]{whose}")  # fmt: skip
    lines += ["", "Accounts", "--------"]
    if not explanation.reckoning.findings:
        lines.append(word("report.no_findings"))
    lines += explanation.remarks
    shown = explanation.accounts[:SHOWN_ACCOUNTS]
    for rank, account in enumerate(shown, start=1):
        lines += _account_lines(rank, account)
    rest = max(0.0, 1.0 - sum(account.posterior for account in shown))
    lines.append(f"{rest:.3f} {word('report.others')}")
    lines += ["", "Next tests", "----------"]
    for row in explanation.next_tests.head(5).itertuples():
        side = "" if row.side == "none" else f" ({row.side})"
        lines.append(f"  {row.bits:.3f} bits  {row.name}{side}, {row.minutes:g} min")
    telling = [(row.bits, row.name, row.image) for row in explanation.next_images.head(SHOWN_SCANS).itertuples()]
    telling += [(row.bits, word(f"accounts.axis_{row.axis}"), row.image)
                for row in explanation.next_axes.head(SHOWN_SCANS).itertuples()]  # fmt: skip
    if telling:
        title = word("report.most_telling")
        lines += ["", title, "-" * len(title)]
        lines += [f"  {bits:.3f} bits  {name}: {image}" for bits, name, image in telling]
    lines += ["", word("report.bits_mean")]
    lines += ["", f"Anatomy: {anatomy_words(explanation)}.", "No atlas entry does not mean no tract."]
    return "\n".join(lines)


def _account_lines(rank: int, account: Account) -> list[str]:
    lines = [f"{rank}. {account.title}",
             f"   {account.kind}: posterior {account.posterior:.3f} ({account.words}): "
             f"{word('report.posterior_means')}; "
             f"odds compared with the plain cortical reading {account.odds_vs_cortical:.2g}"]  # fmt: skip
    for label, signs in (("explains", account.explains), ("leaves", account.leaves),
                         ("predicts in vain", account.predicts_absent)):  # fmt: skip
        if signs:
            lines.append(f"   {label}: {_names(f'{s.name} ({s.p_sign:.2f})' for s in signs)}")
    for words in account.bottlenecks["words"].head(3):
        lines.append(f"   {words.partition('; ')[0]}")
    return lines


def _names(words: Iterable[str]) -> str:
    return ", ".join(words)
