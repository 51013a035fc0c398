"""The house's paper: fonts, styles, tables, and "page x of y" on every page."""

import io
from collections.abc import Sequence
from datetime import datetime
from functools import cache
from pathlib import Path
from typing import Any
from xml.sax.saxutils import escape

FONT, BOLD = "Vera", "VeraBd"
CAUTION = (
    "A decision aid, not a licence to work. Local codes, the equipment's approval and the judgement "
    "of a qualified person come first."
)
UNCONFIRMED = " (unconfirmed)"
MARGIN_MM = 16
# Signs that the embedded font lacks, with what says the same.
SPARE = {
    "\u2009": "\u00a0",
    "\u202f": "\u00a0",
    "≥": "at least",
    "≤": "at most",
    "●": "*",
    "○": "-",
    "−": "-",
}


@cache
def _fonts() -> Any:
    import reportlab
    from reportlab.pdfbase import pdfmetrics
    from reportlab.pdfbase.ttfonts import TTFont

    folder = Path(reportlab.__file__).parent / "fonts"
    for name, file in ((FONT, "Vera.ttf"), (BOLD, "VeraBd.ttf"), ("VeraIt", "VeraIt.ttf")):
        pdfmetrics.registerFont(TTFont(name, str(folder / file)))
    pdfmetrics.registerFontFamily(FONT, normal=FONT, bold=BOLD, italic="VeraIt", boldItalic=BOLD)
    return pdfmetrics.getFont(FONT).face.charToGlyph


def plain(text: object) -> str:
    """Text that the embedded font can show; a letter it lacks is told as "?" with its plain form."""
    import unicodedata

    known = _fonts()
    shown = []
    for sign in str(text):
        if ord(sign) in known or sign in "\n\t":
            shown.append(sign)
        elif sign in SPARE:
            shown.append(SPARE[sign])
        else:
            base = unicodedata.normalize("NFKD", sign)[0]
            shown.append(base if ord(base) in known else "?")
    return "".join(shown)


def safe(text: object) -> str:
    """The same, with what paragraphs read as marks escaped."""
    return escape(plain(text))


class Sheet:
    """Collects what stands on the paper and makes the PDF."""

    def __init__(self, *, title: str, footer: str, printed_at: datetime, by: str) -> None:
        from reportlab.lib.enums import TA_LEFT
        from reportlab.lib.styles import ParagraphStyle

        _fonts()
        self.title, self.footer, self.printed_at, self.by = title, footer, printed_at, by
        base = ParagraphStyle("text", fontName=FONT, fontSize=8.5, leading=12, alignment=TA_LEFT)
        self.styles = {
            "text": base,
            "small": ParagraphStyle("small", parent=base, fontSize=7, leading=9.4),
            "cell": ParagraphStyle("cell", parent=base, fontSize=7.2, leading=9.2),
            "head": ParagraphStyle("head", parent=base, fontName=BOLD, fontSize=7.2, leading=9.2),
            "h1": ParagraphStyle(
                "h1", parent=base, fontName=BOLD, fontSize=17, leading=21, spaceAfter=6
            ),
            "h2": ParagraphStyle(
                "h2",
                parent=base,
                fontName=BOLD,
                fontSize=12.5,
                leading=16,
                spaceBefore=10,
                spaceAfter=4,
                keepWithNext=1,
            ),
            "h3": ParagraphStyle(
                "h3",
                parent=base,
                fontName=BOLD,
                fontSize=9.5,
                leading=13,
                spaceBefore=8,
                spaceAfter=2,
                keepWithNext=1,
            ),
        }
        self.story: list[Any] = []

    @property
    def width_pt(self) -> float:
        from reportlab.lib.pagesizes import A4
        from reportlab.lib.units import mm

        return float(A4[0] - 2 * MARGIN_MM * mm)

    def heading(self, text: str, *, level: int = 2) -> None:
        """A heading that stands in the outline as well."""
        from reportlab.platypus import Paragraph

        made = Paragraph(safe(text), self.styles[f"h{level}"])
        made.outline = (plain(text), level - 1)
        self.story.append(made)

    def text(self, text: str, *, style: str = "text") -> None:
        from reportlab.platypus import Paragraph

        self.story.append(Paragraph(safe(text), self.styles[style]))

    def space(self, points: float = 6) -> None:
        from reportlab.platypus import Spacer

        self.story.append(Spacer(1, points))

    def new_page(self) -> None:
        from reportlab.platypus import PageBreak

        self.story.append(PageBreak())

    def draw(self, drawing: Any) -> None:
        self.story.append(drawing)

    def table(
        self, header: Sequence[str], rows: Sequence[Sequence[object]], *, widths: Sequence[float]
    ) -> None:
        """A table whose header comes again on every page.

        Args:
            header: words of the columns.
            rows: cells, in the order of the header; none prints "None." instead.
            widths: shares of the width, one a column.
        """
        from reportlab.lib.colors import Color
        from reportlab.platypus import LongTable, Paragraph, TableStyle

        if not rows:
            self.text("None.")
            return
        cell, head = self.styles["cell"], self.styles["head"]
        made = [[Paragraph(safe(word), head) for word in header]]
        made += [[Paragraph(safe(word), cell) for word in row] for row in rows]
        unit = self.width_pt / sum(widths)
        line = Color(0.78, 0.77, 0.73)
        style = TableStyle(
            [
                ("VALIGN", (0, 0), (-1, -1), "TOP"),
                ("LINEBELOW", (0, 0), (-1, 0), 1, Color(0.114, 0.165, 0.2)),
                ("LINEBELOW", (0, 1), (-1, -1), 0.4, line),
                ("LEFTPADDING", (0, 0), (-1, -1), 3),
                ("RIGHTPADDING", (0, 0), (-1, -1), 3),
                ("TOPPADDING", (0, 0), (-1, -1), 2.5),
                ("BOTTOMPADDING", (0, 0), (-1, -1), 2.5),
            ]
        )
        self.story.append(
            LongTable(made, colWidths=[w * unit for w in widths], repeatRows=1, style=style)
        )

    def pdf(self) -> bytes:
        """The finished paper; the same content and stamp give the same bytes."""
        from reportlab.lib.pagesizes import A4
        from reportlab.lib.units import mm
        from reportlab.platypus import SimpleDocTemplate

        out = io.BytesIO()
        margin = MARGIN_MM * mm
        document = SimpleDocTemplate(
            out,
            pagesize=A4,
            leftMargin=margin,
            rightMargin=margin,
            topMargin=margin + 4 * mm,
            bottomMargin=margin + 4 * mm,
            title=plain(self.title),
            author=plain(self.by),
            invariant=1,
        )
        document.afterFlowable = lambda one: _outlined(document, one)
        numbered = _numbered(self)
        document.build(self.story, canvasmaker=numbered)
        return out.getvalue()


def _outlined(document: Any, flowable: Any) -> None:
    outline = getattr(flowable, "outline", None)
    if outline is None:
        return
    text, level = outline
    key = f"p{document.page}-{text}"
    document.canv.bookmarkPage(key)
    document.canv.addOutlineEntry(text, key, level=max(level, 0), closed=level > 0)


def _numbered(sheet: Sheet) -> type:
    from reportlab.lib.units import mm
    from reportlab.pdfgen.canvas import Canvas

    class Numbered(Canvas):
        """Keeps the pages until their number is known."""

        def __init__(self, *args: Any, **kwargs: Any) -> None:
            super().__init__(*args, **kwargs)
            self._kept: list[dict[str, Any]] = []

        def showPage(self) -> None:  # noqa: N802  reportlab's name
            self._kept.append(dict(self.__dict__))
            self._startPage()

        def save(self) -> None:
            count = len(self._kept)
            for number, page in enumerate(self._kept, start=1):
                self.__dict__.update(page)
                self._frame(number, count)
                super().showPage()
            super().save()

        def _frame(self, number: int, count: int) -> None:
            width, height = self._pagesize
            left, right = MARGIN_MM * mm, width - MARGIN_MM * mm
            self.setFont(FONT, 7)
            self.drawString(left, height - 11 * mm, plain(sheet.title))
            stamp = f"{sheet.printed_at:%Y-%m-%d %H:%M %Z} by {sheet.by}"
            self.drawRightString(right, height - 11 * mm, plain(stamp))
            self.line(left, height - 13 * mm, right, height - 13 * mm)
            self.line(left, 14 * mm, right, 14 * mm)
            self.drawString(left, 10.5 * mm, plain(sheet.footer))
            self.drawRightString(right, 10.5 * mm, f"page {number} of {count}")
            self.drawString(left, 7.5 * mm, plain(CAUTION))

    return Numbered
