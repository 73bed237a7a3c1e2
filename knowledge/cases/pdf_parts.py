"""Pieces of the printed report: typeface, styles, and small drawings that read without colour."""

from __future__ import annotations

import base64
import io
from collections.abc import Iterable, Sequence
from typing import Any
from xml.sax.saxutils import escape

from markdown_it import MarkdownIt
from reportlab.lib import colors
from reportlab.lib.styles import ParagraphStyle
from reportlab.lib.utils import ImageReader
from reportlab.pdfbase import pdfmetrics
from reportlab.pdfbase.ttfonts import TTFont
from reportlab.platypus import Flowable, Paragraph, Table

from byway.knowledge.cases.pictures import SliceView

__all__ = ["INK", "QUIET", "RULE", "STYLES", "Ink", "PosteriorBar", "SliceFigure", "TwinBar", "grid"]

INK, QUIET, RULE = colors.Color(0.1, 0.12, 0.14), colors.Color(0.34, 0.38, 0.42), colors.Color(0.8, 0.82, 0.85)
NORMAL, BOLD, ITALIC, BOTH = "BywaySans", "BywaySans-Bold", "BywaySans-Italic", "BywaySans-BoldItalic"
FACES = {NORMAL: "Vera.ttf", BOLD: "VeraBd.ttf", ITALIC: "VeraIt.ttf", BOTH: "VeraBI.ttf"}
MISSING = "¤"


def _register() -> None:
    if NORMAL not in pdfmetrics.getRegisteredFontNames():
        for name, file in FACES.items():
            pdfmetrics.registerFont(TTFont(name, file))
        pdfmetrics.registerFontFamily(NORMAL, normal=NORMAL, bold=BOLD, italic=ITALIC, boldItalic=BOTH)


_register()


def _style(name: str, size: float, **more: Any) -> ParagraphStyle:
    usual = {"fontName": NORMAL, "fontSize": size, "leading": size * 1.38, "textColor": INK}
    return ParagraphStyle(name, **{**usual, **more})


STYLES = {
    "title": _style("title", 15, fontName=BOLD, spaceAfter=3),
    "heading": _style("heading", 10.5, fontName=BOLD, spaceBefore=9, spaceAfter=3, keepWithNext=1),
    "card": _style("card", 8.8, fontName=BOLD, spaceBefore=2, keepWithNext=1),
    "text": _style("text", 8, spaceAfter=2),
    "quiet": _style("quiet", 7.2, textColor=QUIET, spaceAfter=2),
    "cell": _style("cell", 7.2),
    "number": _style("number", 7.2, alignment=2),
    "head": _style("head", 7, textColor=QUIET),
    "head_number": _style("head_number", 7, textColor=QUIET, alignment=2),
    "caution": _style("caution", 8, borderWidth=0.8, borderColor=INK, borderPadding=4, spaceBefore=7, spaceAfter=8),
    "item": _style("item", 7.6, leftIndent=10, bulletIndent=2, spaceAfter=1),
}


class Ink:
    """Turns text into paragraphs; counts characters that the typeface lacks, which print as ``¤``."""

    def __init__(self) -> None:
        self.missing = 0
        self._has = pdfmetrics.getFont(NORMAL).face.charToGlyph

    def plain(self, text: object) -> str:
        """Text that prints, with nothing in it that could be taken for markup."""
        out = []
        for letter in str(text):
            if letter in "\n\t" or ord(letter) in self._has:
                out.append(letter)
            elif letter.isprintable():
                self.missing += 1
                out.append(MISSING)
        return escape("".join(out))

    def say(self, text: object, style: str = "text") -> Paragraph:
        """A paragraph of plain text."""
        return Paragraph(self.plain(text).replace("\n", "<br/>"), STYLES[style])

    def rich(self, parts: Sequence[tuple[str, object]], style: str = "text") -> Paragraph:
        """A paragraph of parts, each ``""`` (plain), ``"b"`` or ``"i"``."""
        words = (f"<{kind}>{self.plain(text)}</{kind}>" if kind else self.plain(text) for kind, text in parts)
        return Paragraph("".join(words), STYLES[style])

    def markdown(self, text: str) -> list[Flowable]:
        """Markdown as paragraphs: emphasis, lists, headings, quotes, code and tables; anything else as its text."""
        flow: list[Flowable] = []
        depth, style = 0, "text"
        for token in MarkdownIt("commonmark", {"html": False}).enable("table").parse(text):
            if token.type in ("bullet_list_open", "ordered_list_open"):
                depth += 1
            elif token.type in ("bullet_list_close", "ordered_list_close"):
                depth -= 1
            elif token.type == "heading_open":
                style = "card"
            elif token.type == "heading_close":
                style = "text"
            elif token.type in ("fence", "code_block"):
                flow.append(self.say(token.content.rstrip("\n"), "quiet"))
            elif token.type == "inline":
                words = self._inline(token.children or [])
                bullet = {"bulletText": "•"} if depth else {}
                flow.append(Paragraph(words, STYLES["item" if depth else style], **bullet))
        return flow

    def _inline(self, tokens: Iterable[Any]) -> str:
        marks = {"strong_open": "<b>", "strong_close": "</b>", "em_open": "<i>", "em_close": "</i>",
                 "softbreak": " ", "hardbreak": "<br/>"}  # fmt: skip
        out = []
        for token in tokens:
            if token.type in marks:
                out.append(marks[token.type])
            elif token.type in ("text", "code_inline", "html_inline", "text_special", "image"):
                out.append(self.plain(token.content))
        return "".join(out)

    def cells(self, values: Iterable[object], numbers: Iterable[int] = (), head: bool = False) -> list[Any]:
        """A table's row; columns in ``numbers`` are set to the right; flowables pass as they are."""
        right = set(numbers)
        styles = ("head", "head_number") if head else ("cell", "number")
        return [v if isinstance(v, Flowable) else self.say("" if v is None else v, styles[i in right])
                for i, v in enumerate(values)]  # fmt: skip


def grid(rows: list[list[Any]], widths: Sequence[float], foot: int = 0) -> Table:
    """A table with a repeated head, hairlines and, where asked for, ``foot`` rows set off below."""
    style: list[tuple[Any, ...]] = [
        ("VALIGN", (0, 0), (-1, -1), "TOP"),
        ("LINEBELOW", (0, 0), (-1, 0), 0.7, QUIET),
        ("LINEBELOW", (0, 1), (-1, -1), 0.3, RULE),
        ("TOPPADDING", (0, 0), (-1, -1), 1.6),
        ("BOTTOMPADDING", (0, 0), (-1, -1), 1.6),
        ("LEFTPADDING", (0, 0), (-1, -1), 0),
        ("RIGHTPADDING", (0, 0), (-1, -1), 5),
    ]
    if foot:
        style.append(("LINEABOVE", (0, -foot), (-1, -foot), 0.7, QUIET))
    return Table(rows, colWidths=list(widths), repeatRows=1, style=style, hAlign="LEFT", spaceAfter=4)


class _Drawn(Flowable):  # type: ignore[misc]
    def __init__(self, width: float, height: float) -> None:
        super().__init__()
        self.width, self.height = width, height

    def wrap(self, *_: float) -> tuple[float, float]:
        """Fixed size, points."""
        return self.width, self.height


class PosteriorBar(_Drawn):
    """A posterior in [0, 1] as a filled part of an outlined bar."""

    def __init__(self, value: float, width: float) -> None:
        super().__init__(width, 7)
        self.value = value

    def draw(self) -> None:
        """Outline, then the filled part."""
        self.canv.setStrokeColor(QUIET)
        self.canv.setFillColor(QUIET)
        self.canv.setLineWidth(0.4)
        self.canv.rect(0, 1, self.width, 5, fill=0)
        self.canv.rect(0, 1, self.width * self.value, 5, fill=1, stroke=0)


class TwinBar(_Drawn):
    """Two probabilities, one above the other: filled for the full model, open for the plain cortical reading."""

    def __init__(self, full: float, plain: float, width: float = 60) -> None:
        super().__init__(width, 9)
        self.full, self.plain = full, plain

    def draw(self) -> None:
        """A hairline for the whole width, then the bars."""
        self.canv.setLineWidth(0.4)
        self.canv.setStrokeColor(INK)
        self.canv.setFillColor(INK)
        self.canv.rect(0, 5, self.width * self.full, 2.8, fill=1, stroke=0)
        self.canv.rect(0, 1, self.width * self.plain, 2.8, fill=0)
        self.canv.setStrokeColor(RULE)
        self.canv.line(self.width, 0.5, self.width, 8.3)


class SliceFigure(_Drawn):
    """A slice with L and R written on it, and its plane and coordinate below."""

    def __init__(self, view: SliceView, width: float) -> None:
        super().__init__(width, width * view.height / view.width + 10)
        self.view = view
        self._picture = ImageReader(io.BytesIO(base64.b64decode(view.data_uri.partition(",")[2])))

    def draw(self) -> None:
        """The picture, then its letters in white with a dark edge."""
        canvas, view = self.canv, self.view
        canvas.drawImage(self._picture, 0, 10, self.width, self.height - 10)
        if view.plane != "sagittal":
            canvas.setFont(BOLD, 9)
            canvas.setFillColor(colors.white)
            canvas.drawString(3, self.height - 10, "L")
            canvas.drawRightString(self.width - 3, self.height - 10, "R")
        canvas.setFont(NORMAL, 6.5)
        canvas.setFillColor(QUIET)
        canvas.drawString(0, 2, f"{view.plane}, {view.axis} = {view.at_mm:g} mm")
