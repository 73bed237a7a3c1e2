"""The report as PDF, for print and for people who have no byway: the facts of the HTML report, page by page."""

from __future__ import annotations

import io
from pathlib import Path
from typing import Any

from reportlab.lib.pagesizes import A4
from reportlab.lib.units import mm
from reportlab.pdfgen.canvas import Canvas
from reportlab.platypus import BaseDocTemplate, Flowable, Frame, KeepInFrame, KeepTogether, PageTemplate, Spacer, Table

from byway.knowledge.atomic import write_bytes
from byway.knowledge.cases.case import Case
from byway.knowledge.cases.pdf_parts import NORMAL, QUIET, Ink, PosteriorBar, SliceFigure, TwinBar, grid
from byway.knowledge.cases.report_facts import (
    AccountFacts,
    ReportFacts,
    clearance,
    facts_of,
    odds,
    posterior,
    share,
    signed,
)
from byway.knowledge.reasoning.explain import Explanation
from byway.knowledge.words import section, word

__all__ = ["report_pdf", "write_pdf"]

MARGIN = 16 * mm
WIDTH = A4[0] - 2 * MARGIN


class _Numbered(Canvas):  # type: ignore[misc]
    """A canvas that writes title, caution and page number on every page once their count is known."""

    title, caution = "", ""

    def __init__(self, *args: Any, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self._pages: list[dict[str, Any]] = []

    def showPage(self) -> None:  # noqa: N802 - the library's name
        """Keep the page until all are there."""
        self._pages.append(dict(self.__dict__))
        self._startPage()

    def save(self) -> None:
        """Write foot lines, then the file."""
        for number, page in enumerate(self._pages, start=1):
            self.__dict__.update(page)
            self.setFont(NORMAL, 6.3)
            self.setFillColor(QUIET)
            self.drawString(MARGIN, 9 * mm, self.caution)
            said = word("report.page_of", page=number, pages=len(self._pages))
            self.drawRightString(A4[0] - MARGIN, 9 * mm, said)
            if number > 1:
                self.drawString(MARGIN, A4[1] - 10 * mm, self.title[:110])
            super().showPage()
        super().save()


def report_pdf(case: Case, explanation: Explanation, **choices: Any) -> bytes:
    """The report as a PDF file's bytes.

    Parameters
    ----------
    case, explanation
        As for :func:`~byway.knowledge.cases.report.report_html`.
    **choices
        ``notes`` and ``full``, as for :func:`~byway.knowledge.cases.report_facts.facts_of`.
    """
    facts, ink, w = facts_of(case, explanation, **choices), Ink(), section("report")
    story = [*_head(facts, ink, w), *_hit(facts, ink, w), *_profile(facts, ink, w), *_accounts(facts, ink, w)]
    if facts.full:
        story += _team(facts, ink, w)
    story += [*_remote(facts, ink, w), *_next(facts, ink, w), *_notes(facts, ink, w)]
    if facts.full:
        story += _back(facts, ink, w)
    if ink.missing:
        story.append(ink.say(word("report.missing_glyphs", count=ink.missing), "quiet"))
    if not facts.full:  # one page, whatever it takes
        story = [KeepInFrame(WIDTH, A4[1] - 28 * mm, story, mode="shrink")]
    held = io.BytesIO()
    title = ink.plain(facts.title)
    canvas = type("_Canvas", (_Numbered,), {"title": title, "caution": explanation.caution})
    document = BaseDocTemplate(held, pagesize=A4, leftMargin=MARGIN, rightMargin=MARGIN, topMargin=14 * mm,
                               bottomMargin=14 * mm, title=facts.title, author="byway", invariant=1)  # fmt: skip
    frame = Frame(MARGIN, 14 * mm, WIDTH, A4[1] - 28 * mm, 0, 0, 0, 0)
    document.addPageTemplates([PageTemplate(frames=[frame])])
    document.build(story, canvasmaker=canvas)
    return held.getvalue()


def write_pdf(case: Case, explanation: Explanation, path: Path, **choices: Any) -> Path:
    """Write the report as PDF to ``path``; see :func:`report_pdf` for the choices."""
    write_bytes(path, report_pdf(case, explanation, **choices))
    return path


def _head(f: ReportFacts, ink: Ink, w: dict[str, str]) -> list[Flowable]:
    spec, lesion = f.case.spec, f.lesion
    invented = [("b", w["invented"] + " ")] if spec.invented else []
    line = (f"{spec.stage} {spec.cause.replace('_', ' ')} · {w['handedness']} {spec.person.handedness} · "
            f"{w['age_band']} {spec.person.age_band} · {w['made']} {f.made}")  # fmt: skip
    measured = (f"{w['volume']} {lesion.volume_ml:.1f} ml · {w['drawn_on']} {spec.lesion.drawn_on.replace('_', ' ')} · "
                f"{w['uncharted']} {share(f.explanation.uncharted_share)}. {w['no_atlas']}")  # fmt: skip
    width = (WIDTH - 6 * (len(f.views) - 1)) / len(f.views) if f.full else 27 * mm
    figures = [SliceFigure(view, width) for view in f.views]
    row: list[Any] = [figures]
    pictures = Table(row, colWidths=[width + 6] * len(figures), hAlign="LEFT",
                     style=[("LEFTPADDING", (0, 0), (-1, -1), 0), ("VALIGN", (0, 0), (-1, -1), "BOTTOM")])  # fmt: skip
    return [
        ink.say(f.title, "title"), ink.rich([*invented, ("", line)], "quiet"),
        ink.say(f.explanation.caution, "caution"), ink.say(w["lesion"], "heading"), ink.say(measured),
        *(ink.say(note, "quiet") for note in lesion.notes), pictures,
        ink.say(f.legend, "quiet"),
    ]  # fmt: skip


def _hit(f: ReportFacts, ink: Ink, w: dict[str, str]) -> list[Flowable]:
    numbers = range(3, 7)
    head = [w["element"], w["side"], w["kind"], w["share"], "5–95 %", w["overlap"], w["clearance"], w["whose"]]
    rows = [ink.cells(head, numbers, head=True)]
    rows += [ink.cells([r["name"], r["side"], w["lost"] if r["kind"] == "region" else w["severed"], share(r["share"]),
                        f"{share(r['low'])}–{share(r['high'])}", f"{r['overlap_ml']:.2f}",
                        " ".join(clearance(r["clearance_mm"])).rstrip(), r["anatomy"]], numbers)
             for r in f.hit]  # fmt: skip
    widths = [WIDTH - 322, 38, 46, 36, 54, 42, 46, 60]
    return [ink.say(w["hit"], "heading"), ink.say(f"{w['anatomy']} {f.anatomy}. {w['interval']}", "quiet"),
            grid(rows, widths), *_anatomies(f, ink, w)]  # fmt: skip


def _anatomies(f: ReportFacts, ink: Ink, w: dict[str, str]) -> list[Flowable]:
    if not f.anatomies:
        return []
    numbers = range(3, 7)
    head = [w["element"], w["side"], w["whose"], w["by_template"], w["by_own"], w["difference"], w["apart"]]
    rows = [ink.cells(head, numbers, head=True)]
    rows += [ink.cells([r["name"], r["side"], r["own_anatomy"], share(r["share"]), share(r["own_share"]),
                        signed(r["difference"]), f"{r['apart_mm']:.1f}"], numbers) for r in f.anatomies]  # fmt: skip
    return [ink.say(w["anatomies"], "heading"), ink.say(w["anatomies_text"], "quiet"),
            grid(rows, [WIDTH - 316, 38, 80, 50, 50, 50, 48])]  # fmt: skip


def _profile(f: ReportFacts, ink: Ink, w: dict[str, str]) -> list[Flowable]:
    numbers = (4, 5)
    head = [w["sign"], w["side"], w["found"], "", w["expected"], w["expected_cortical"]]
    rows = [ink.cells(head, numbers, head=True)]
    for r in f.profile:
        present = r["found"] not in (None, "absent")
        found = ink.rich([("b", r["found"])], "cell") if present else r["found"] or w["not_tested"]
        rows.append(ink.cells([r["name"], _side(r), found, TwinBar(r["expected"], r["expected_cortical"]),
                               share(r["expected"]), share(r["expected_cortical"])], numbers))  # fmt: skip
    return [ink.say(w["profile"], "heading"), ink.say(w["profile_key"], "quiet"),
            grid(rows, [WIDTH - 314, 32, 58, 68, 78, 78])]  # fmt: skip


def _remote(f: ReportFacts, ink: Ink, w: dict[str, str]) -> list[Flowable]:
    if not f.remote:
        return []
    rows = [ink.cells([w["element"], w["lost_input"], w["strength"], w["communicability"]], range(1, 4), head=True)]
    rows += [ink.cells([r["words"], share(r["lost_input"]), f"{r['strength_before']:.1f} – {r['strength_after']:.1f}",
                        share(r["communicability_kept"])], range(1, 4)) for r in f.remote]  # fmt: skip
    return [ink.say(w["remote"], "heading"), ink.say(w["remote_text"], "quiet"),
            grid(rows, [WIDTH - 216, 56, 80, 80])]  # fmt: skip


def _accounts(f: ReportFacts, ink: Ink, w: dict[str, str]) -> list[Flowable]:
    flow: list[Flowable] = [ink.say(w["accounts"], "heading")]
    flow += [ink.rich([("b", w["no_findings"])])] if f.no_findings else []
    flow += [ink.rich([("b", remark)]) for remark in f.remarks]
    for card in f.accounts:
        head, more = _card(card, f.full, ink, w)
        flow += [*_together(head, f.full), *more, Spacer(0, 4)]
    return [*flow, ink.say(f"{posterior(f.rest_posterior)} {w['others']}", "quiet")]


def _card(card: AccountFacts, full: bool, ink: Ink, w: dict[str, str]) -> tuple[list[Flowable], list[Flowable]]:
    it = card.it
    head: list[Flowable] = [
        ink.say(f"{card.rank + 1}. {it.title}", "card"),
        PosteriorBar(it.posterior, WIDTH * 0.5),
        Spacer(0, 2),
        ink.rich([("", w["posterior"] + " "), ("b", posterior(it.posterior)),
                  ("", f" ({it.words}): {w['posterior_means']} · {w['odds']} {odds(it.odds_vs_cortical)} · "
                       f"{it.kind.replace('_', ' ')}")]),
    ]  # fmt: skip
    for label, signs in ((w["explains"], it.explains), (w["leaves"], it.leaves),
                         (w["predicts_absent"], it.predicts_absent)):  # fmt: skip
        if signs:
            named = ", ".join(f"{s.name}{'' if s.side == 'none' else f' ({s.side})'} {share(s.p_sign)}" for s in signs)
            head.append(ink.rich([("b", label + " "), ("", named)]))
    for stands in ("held", "doubted", "ruled_out"):
        if card.standing[stands]:
            head.append(ink.rich([("b", w[stands] + ": "), ("", ", ".join(card.standing[stands]))]))
    if not full:
        return head, []
    head += [ink.say(f"{b['words']} ({w['capacity']} {share(b['capacity'])})", "quiet") for b in card.bottlenecks]
    parts = "; ".join(f"{name} ({share(part)})" for _, name, part in card.elements)
    more: list[Flowable] = [ink.say(f"{w['explained_by']} {parts}", "quiet")] if parts else []
    more += [ink.say(one.words, "quiet") for one in it.sparing]
    numbers = (3, 4, 5)
    rows = [ink.cells([w["ledger"], w["side"], w["found"], "P", w["loglik"], w["vs_cortical"]], numbers, head=True)]
    for r in card.ledger:
        finding = r["row"] == "finding"
        name = r["name"] if finding else w[f"ledger_{r['row']}"]
        rows.append(ink.cells([name, _side(r) if finding else "", r["found"],
                               share(r["p_sign"]) if finding else "", signed(r["loglik"]), signed(r["vs_cortical"])],
                              numbers))  # fmt: skip
    rows.append(ink.cells([w["sum"], "", "", "", signed(card.ledger_sum["loglik"]),
                           signed(card.ledger_sum["vs_cortical"])], numbers))  # fmt: skip
    more.append(grid(rows, [WIDTH - 290, 40, 50, 40, 70, 90], foot=1))
    if card.rank == 0:
        more += [ink.say(w["p_means"], "quiet"), ink.say(w["loglik_means"], "quiet")]
    for label, claims in ((w["claims_for"], card.claims_for), (w["claims_against"], card.claims_against)):
        if claims:
            more.append(ink.rich([("b", label)]))
        for claim, sources in claims:
            cited = ", ".join(f"{s.authors} {s.year}" for s in sources)
            more.append(ink.say(f"– {claim.says} ({claim.grade}; {claim.kind.replace('_', ' ')}; {cited})", "item"))
    more += [ink.say(caution, "quiet") for caution in it.cautions]
    return head, more


def _team(f: ReportFacts, ink: Ink, w: dict[str, str]) -> list[Flowable]:
    if not f.reasons:
        return []
    rows = [ink.cells([w["account"], w["person"], w["stands"], w["reason"]], head=True)]
    rows += [ink.cells([title, author, w[stands], reason]) for title, author, stands, reason in f.reasons]
    return [ink.say(w["standing"], "heading"), grid(rows, [WIDTH * 0.38, WIDTH * 0.1, WIDTH * 0.12, WIDTH * 0.4])]


def _next(f: ReportFacts, ink: Ink, w: dict[str, str]) -> list[Flowable]:
    rows = [ink.cells([w["sign"], w["side"], w["bits"], w["minutes"]], (2, 3), head=True)]
    rows += [ink.cells([r["name"], _side(r), f"{r['bits']:.3f}", f"{r['minutes']:g}"], (2, 3)) for r in f.next_tests]
    tests = [ink.say(w["next"], "heading"), grid(rows, [WIDTH - 180, 60, 60, 60]), ink.say(w["bits_mean"], "quiet")]
    return [*_together(tests, f.full), *_most_telling(f, ink, w)]


def _most_telling(f: ReportFacts, ink: Ink, w: dict[str, str]) -> list[Flowable]:
    parts: list[Flowable] = []
    if f.next_images:
        rows = [ink.cells([w["scan_of"], "5–95 %", w["what_could"], w["bits"]], (1, 3), head=True)]
        rows += [ink.cells([r["name"], f"{share(r['low'])}–{share(r['high'])}", r["image"], f"{r['bits']:.3f}"], (1, 3))
                 for r in f.next_images]  # fmt: skip
        parts.append(grid(rows, [WIDTH - 290, 60, 180, 50]))
    if f.next_axes:
        rows = [ink.cells([w["question"], w["what_could"], w["bits"]], (2,), head=True)]
        rows += [ink.cells([r["question"], r["image"], f"{r['bits']:.3f}"], (2,)) for r in f.next_axes]
        parts.append(grid(rows, [WIDTH - 330, 280, 50]))
    return [KeepTogether([ink.say(w["most_telling"], "heading"), *parts])] if parts else []


def _notes(f: ReportFacts, ink: Ink, w: dict[str, str]) -> list[Flowable]:
    if not f.notes:
        return []
    flow: list[Flowable] = [ink.say(w["notes"], "heading")]
    for depth, note, settled in f.notes:
        where = note.anchor.key or ("({:g}, {:g}, {:g}) mm".format(*note.anchor.mm) if note.anchor.mm else "")
        parts = [note.author, note.time, where, *note.tags, w["settled"] if settled else ""]
        block = [ink.say(" · ".join(part for part in parts if part), "quiet"), *ink.markdown(note.text)]
        style = [("LEFTPADDING", (0, 0), (-1, -1), 0), ("TOPPADDING", (0, 0), (-1, -1), 1)]
        cells: list[Any] = ["", block]
        flow.append(Table([cells], colWidths=[12.0 * depth, WIDTH - 12.0 * depth], style=style))
    return flow


def _back(f: ReportFacts, ink: Ink, w: dict[str, str]) -> list[Flowable]:
    numbers = ", ".join(f"{name} {number}" for name, number in f.versions.items())
    hashed = f"{w['graph_hash']} {f.graph_hash}, {w['schema']} {f.case.spec.schema_version}"
    flow: list[Flowable] = [
        ink.say(w["methods"], "heading"),
        ink.say(w["methods_text"]),
        ink.say(f"{w['versions']} {numbers}, {hashed}.", "quiet"),
        ink.say(w["sources"], "heading"),
    ]
    for s in f.sources:
        title = f"{s.title}. " if s.title else ""
        doi = f". doi:{s.doi}" if s.doi else ""
        read = w["checked_read"] if s.checked == "read" else w["checked_memory"]
        flow.append(ink.say(f"– {s.authors} ({s.year}). {title}{s.container}{doi} [{read}]", "item"))
    return flow


def _together(parts: list[Flowable], full: bool) -> list[Flowable]:
    """Parts that stay on one page; a summary is one page anyway."""
    return [KeepTogether(parts)] if full else parts


def _side(row: dict[str, Any]) -> str:
    return "" if row["side"] in ("none", None) else str(row["side"])
