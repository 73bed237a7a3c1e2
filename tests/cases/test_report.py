"""The report says what the API says, number by number, in HTML, PDF and tables; and nothing in it can run."""

from __future__ import annotations

import html.parser
import io
import re
import shutil
from html import unescape
from pathlib import Path

import pandas as pd
import pytest
from browser.strings import INJECTIONS
from pypdf import PdfReader

from byway.knowledge import Explanation, explain, open_case, write_report
from byway.knowledge.cases.case import Case
from byway.knowledge.cases.pages import Note, OwnAccount, Pages, Standing
from byway.knowledge.cases.pdf import report_pdf
from byway.knowledge.cases.report import MARKDOWN_TAGS, markdown_html, report_html
from byway.knowledge.cases.report_facts import clearance, facts_of, odds, posterior, share, signed
from byway.knowledge.cases.tables import case_tables, safe_cells, write_tables
from byway.knowledge.cases.wording import explanation_text
from byway.knowledge.words import section
from byway.widgets import number_named

CASES = Path(__file__).parents[2] / "notebooks" / "cases"


class Nodes(html.parser.HTMLParser):
    """All elements of a page, and the text of those that name a number."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.found: list[tuple[str, dict[str, str | None]]] = []
        self.numbers: list[tuple[str, str | None, str]] = []
        self._open: tuple[str, str | None] | None = None
        self.feed(page)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Keep the element."""
        given = dict(attrs)
        self.found.append((tag, given))
        if "data-name" in given:
            self._open = (given["data-name"] or "", given.get("data-value"))

    def handle_data(self, data: str) -> None:
        """Keep a number's text."""
        if self._open is not None:
            self.numbers.append((*self._open, data))
            self._open = None


@pytest.fixture(scope="module")
def case(tmp_path_factory: pytest.TempPathFactory) -> Case:
    """A copy of the team's case."""
    folder = tmp_path_factory.mktemp("report") / "team_case"
    shutil.copytree(CASES / "team_case", folder)
    return open_case(folder)


@pytest.fixture(scope="module")
def explanation(case: Case) -> Explanation:
    """The case, explained."""
    return explain(case, draws=30)


@pytest.fixture(scope="module")
def nodes(case: Case, explanation: Explanation) -> Nodes:
    """The full report's elements."""
    return Nodes(report_html(case, explanation))


def api(name: str, case: Case, explanation: Explanation, printed: int) -> float:
    """A number by its name."""
    if name == "lesion/volume_ml":
        return case.lesion.volume_ml
    if name == "rest_posterior":
        return 1.0 - sum(account.posterior for account in explanation.accounts[:printed])
    return number_named(explanation, name)


def test_every_number_is_that_of_the_api(nodes: Nodes, case: Case, explanation: Explanation) -> None:
    """Each number in the HTML carries its name; Python gives the same value under it, and the text is that value
    rounded."""
    printed = sum(1 for _, given in nodes.found if "data-account" in given)
    assert printed == 6
    assert len(nodes.numbers) > 300
    for name, value, text in nodes.numbers:
        wanted = api(name, case, explanation, printed)
        assert float(value or "nan") == pytest.approx(wanted, rel=1e-9, abs=1e-12, nan_ok=True), name
        shown = float(text) if text not in ("–", "") else wanted
        if name.endswith("clearance_mm"):  # depth inside the lesion is told by a word, as on the bench
            wanted, shown = abs(wanted), abs(shown)
        half = 10.0 ** -len(text.partition("e")[0].partition(".")[2]) / 2
        slack = abs(wanted) * 0.06 if name.endswith("odds_vs_cortical") else half * 1.001
        assert shown == pytest.approx(wanted, abs=slack), name


def test_nothing_is_said_without_its_caution_and_source(nodes: Nodes, case: Case, explanation: Explanation) -> None:
    """The page holds the caution twice, whose anatomy it rests on, the versions, and every source that it cites."""
    page = report_html(case, explanation)
    assert page.count("no diagnosis") >= 2
    assert "not this person&#39;s" in page
    for name, number in facts_of(case, explanation).versions.items():
        assert f"{name} {number}" in page
    graph = explanation.reckoning.prepared.graph
    for account in explanation.accounts[:6]:
        for key in account.sources:
            assert str(graph.sources[key].year) in page


def test_the_page_stands_alone(nodes: Nodes) -> None:
    """No script, no frame, no foreign address: pictures are in the file."""
    assert {tag for tag, _ in nodes.found} & {"script", "iframe", "object", "link", "embed", "form"} == set()
    assert all((given.get("src") or "data:").startswith("data:") for _, given in nodes.found)


def test_notes_are_those_that_were_chosen(case: Case, explanation: Explanation) -> None:
    """All by default, those given, or none; a settled note says so; standings stand on the cards."""
    notes = [page for page in Pages(case.folder).current("note") if isinstance(page, Note)]
    page = report_html(case, explanation)
    assert page.count('class="note"') == len(notes)
    assert "· settled" in page
    assert "As AB says." in page
    assert report_html(case, explanation, notes=notes[:2]).count('class="note"') == 2
    assert 'class="note"' not in report_html(case, explanation, notes=[])


def pdf_text(data: bytes) -> list[str]:
    """The text of each page, with runs of white space as one blank."""
    return [re.sub(r"\s+", " ", page.extract_text()) for page in PdfReader(io.BytesIO(data)).pages]


def test_the_pdf_has_the_same_numbers(case: Case, explanation: Explanation) -> None:
    """Every row of the tables of the PDF, and every account's line, reads as the API's numbers, rounded alike."""
    pages = pdf_text(report_pdf(case, explanation))
    text = " ".join(pages)
    facts = facts_of(case, explanation)
    for row in facts.hit:
        numbers = (f"{share(row['share'])} {share(row['low'])}–{share(row['high'])} {row['overlap_ml']:.2f} "
                   f"{' '.join(clearance(row['clearance_mm'])).strip()}")  # fmt: skip
        assert numbers in text, row["name"]
    for row in facts.profile:
        assert f"{share(row['expected'])} {share(row['expected_cortical'])}" in text, row["name"]
    for card in facts.accounts:
        assert f"{posterior(card.it.posterior)} ({card.it.words})" in text
        assert f"reading {odds(card.it.odds_vs_cortical)}" in text
        for line in card.ledger:
            assert f"{signed(line['loglik'])} {signed(line['vs_cortical'])}" in text
        assert f"Sum {signed(card.ledger_sum['loglik'])} {signed(card.ledger_sum['vs_cortical'])}" in text
    for row in facts.next_tests:
        assert f"{row['bits']:.3f} {row['minutes']:g}" in text
    for row in facts.next_images:
        assert f"{share(row['low'])}–{share(row['high'])} {row['image']} {row['bits']:.3f}" in text
    for row in facts.next_axes:
        assert f"{row['question']} {row['image']} {row['bits']:.3f}" in text
    assert all("no diagnosis" in page for page in pages)
    assert f"Page {len(pages)} of {len(pages)}" in pages[-1]


def test_a_reader_is_told_what_the_numbers_mean(case: Case, explanation: Explanation) -> None:
    """HTML and PDF say which way the slices face, what P, log-likelihood, bits and posterior are, what the elements'
    shares are of, and where the rest went; depth inside the lesion is a word; only compartments that are there
    are in the key."""
    page = unescape(report_html(case, explanation))
    text = " ".join(pdf_text(report_pdf(case, explanation)))
    said = section("report")
    for key in ("display", "posterior_means", "explained_by", "p_means", "loglik_means", "bits_mean", "others",
                "most_telling"):  # fmt: skip
        assert said[key] in page, key
        assert said[key] in text, key
    for one in (page, text):
        assert re.search(r"\d(</span>)? inside", one)
        assert said["no_findings"] not in one
    kinds = {compartment.kind for compartment in case.lesion.compartments}
    for kind in ("core", "oedema", "other"):
        assert (said[f"legend_{kind}"] in page) == (said[f"legend_{kind}"] in text) == (kind in kinds)


def test_a_case_without_findings_says_so(case: Case) -> None:
    """Where nothing was found or looked for, HTML, PDF and text say that the lesion alone speaks."""
    bare = case.with_spec(findings=())
    told = explain(bare, draws=10)
    notice = section("report")["no_findings"]
    assert notice in report_html(bare, told)
    assert notice in " ".join(pdf_text(report_pdf(bare, told)))
    assert notice in " ".join(pdf_text(report_pdf(bare, told, full=False)))
    assert notice in explanation_text(bare, told)


def test_the_summary_is_one_page(case: Case, explanation: Explanation) -> None:
    """The summary fits one page and still names the leading account, the caution and the next test."""
    (page,) = pdf_text(report_pdf(case, explanation, full=False))
    facts = facts_of(case, explanation, full=False)
    assert posterior(facts.accounts[0].it.posterior) in page
    assert f"{facts.next_tests[0]['bits']:.3f}" in page
    assert page.count("no diagnosis") == 2


def test_tables_hold_unrounded_numbers(case: Case, explanation: Explanation, tmp_path: Path) -> None:
    """Each table reads back from CSV as the API's own, and goes with caution and anatomy."""
    written = {path.name for path in write_tables(case, explanation, tmp_path)}
    assert {f"{name}.csv" for name in case_tables(case, explanation)} | {"about.txt"} == written
    damage = pd.read_csv(tmp_path / "damage.csv")
    assert damage["share"].tolist() == pytest.approx(explanation.damage["share"].tolist(), rel=1e-6)
    ledger = pd.read_csv(tmp_path / "ledger.csv")
    for account in explanation.accounts:
        own = ledger[ledger["account"] == account.key]
        assert own["vs_cortical"].tolist() == pytest.approx(account.ledger["vs_cortical"].tolist())
    assert "no diagnosis" in (tmp_path / "about.txt").read_text()


def test_no_cell_is_a_formula() -> None:
    """Text that a spreadsheet would run is disarmed; numbers stay numbers."""
    table = safe_cells(pd.DataFrame({"text": ["=HYPERLINK(1)", "+1", "-x", "@a", "plain", None], "n": range(-3, 3)}))
    assert table["text"].tolist()[:5] == ["'=HYPERLINK(1)", "'+1", "'-x", "'@a", "plain"]
    assert table["n"].tolist() == list(range(-3, 3))


@pytest.mark.parametrize("text", INJECTIONS)
def test_markdown_keeps_nothing_that_runs(text: str) -> None:
    """Of each script-injection string nothing is left but plain tags without attributes."""
    for tag, given in Nodes(markdown_html(text)).found:
        assert tag in MARKDOWN_TAGS
        assert given == {}


def test_injections_stay_inert_in_the_report(case: Case, explanation: Explanation, tmp_path: Path) -> None:
    """A hundred strings as notes, names, tags, reasons and titles: the report has the elements of a clean one and
    no attribute that runs; the PDF is made and shows them as text."""
    assert len(set(INJECTIONS)) == 100
    folder = tmp_path / "case"
    shutil.copytree(case.folder, folder)
    pages = Pages(folder)
    for text in INJECTIONS:
        pages.put(Note(author=text[:80], text=text, tags=(text,)))
        pages.put(Standing(author=text[:80], account=text, stands="held", reason=text))
        pages.put(OwnAccount(author="AB", title=text, text=text))
    bad = Case(open_case(folder).with_spec(title=INJECTIONS[0]).spec, folder)
    page = write_report(bad, explanation, tmp_path / "out.html").read_text()
    nodes = Nodes(page)
    assert {tag for tag, _ in nodes.found} & {"script", "iframe", "object", "svg", "embed", "form", "input"} == set()
    assert all(not name.startswith("on") for _, given in nodes.found for name in given)
    assert all(given.get("src", "data:").startswith("data:") for _, given in nodes.found)
    text = " ".join(pdf_text(report_pdf(bad, explanation)))
    assert "window.ran=1" in text
