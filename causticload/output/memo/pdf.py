"""The memo on A4 paper, its figures as vectors."""

from __future__ import annotations

import io
from datetime import datetime
from pathlib import Path
from typing import Any
from xml.sax.saxutils import escape, quoteattr

import matplotlib as mpl
from pypdf import PdfReader, PdfWriter
from pypdf.generic import ArrayObject, DecodedStreamObject, DictionaryObject, NameObject
from reportlab.lib.colors import HexColor
from reportlab.lib.pagesizes import A4
from reportlab.lib.styles import ParagraphStyle
from reportlab.lib.units import mm
from reportlab.pdfbase import pdfmetrics
from reportlab.pdfbase.ttfonts import TTFont
from reportlab.platypus import (
    BaseDocTemplate,
    CondPageBreak,
    Flowable,
    Frame,
    KeepTogether,
    LongTable,
    PageTemplate,
    Paragraph,
    Preformatted,
    Spacer,
    TableStyle,
)
from reportlab.platypus.tableofcontents import TableOfContents

from causticload.output.memo import phrases
from causticload.output.memo.blocks import (
    Block,
    Bullets,
    Heading,
    Memo,
    Note,
    Picture,
    Table,
    Text,
    number,
    spans,
)
from causticload.output.memo.drawings import Drawings

LEFT, TOP, BOTTOM = 20 * mm, 18 * mm, 20 * mm
WIDTH = A4[0] - 2 * LEFT
INK, RULE, SHADE = HexColor("#1a1a1a"), HexColor("#8a8f96"), HexColor("#eef0f2")
FONT = "DejaVu"
LINE = 96  # characters of a listing that fit the width


def write_pdf(memo: Memo, drawings: Drawings, path: Path, *, now: datetime) -> None:
    """Write a memo as PDF.

    Parameters
    ----------
    memo : Memo
        The memo.
    drawings : Drawings
        Its figures.
    path : Path
        Where to.
    now : datetime
        Time stamp of the file.
    """
    _load_fonts()
    writer = _Writer(memo, drawings)
    plain = writer.build()
    finished = _put_figures_in(plain, writer.places, drawings, memo, now)
    path.write_bytes(finished)


def _load_fonts() -> None:
    """Embed the fonts that come with matplotlib: they hold Greek, Cyrillic and most of Latin."""
    folder = Path(mpl.get_data_path()) / "fonts" / "ttf"
    for name, file in (("", "DejaVuSans"), ("-B", "DejaVuSans-Bold"), ("-M", "DejaVuSansMono")):
        pdfmetrics.registerFont(TTFont(FONT + name, str(folder / f"{file}.ttf")))
    pdfmetrics.registerFontFamily(
        FONT, normal=FONT, bold=f"{FONT}-B", italic=FONT, boldItalic=f"{FONT}-B"
    )


def _style(name: str, size: float, **more: Any) -> ParagraphStyle:
    return ParagraphStyle(
        name,
        **{"fontName": FONT, "fontSize": size, "leading": 1.36 * size, "textColor": INK, **more},
    )


STYLES = {
    "title": _style("title", 19, fontName=f"{FONT}-B", spaceAfter=2),
    "subtitle": _style("subtitle", 11.5, spaceAfter=9),
    "h1": _style("h1", 12.5, fontName=f"{FONT}-B", spaceBefore=13, spaceAfter=5),
    "h2": _style("h2", 10, fontName=f"{FONT}-B", spaceBefore=10, spaceAfter=4),
    "text": _style("text", 8.6, spaceAfter=5),
    "lead": _style("lead", 8.6, spaceAfter=5, keepWithNext=1),
    "bullet": _style("bullet", 8.6, spaceAfter=2.5, leftIndent=11, bulletIndent=2),
    "note": _style(
        "note",
        8.6,
        spaceBefore=4,
        spaceAfter=8,
        leftIndent=6,
        rightIndent=6,
        backColor=SHADE,
        borderColor=INK,
        borderWidth=0.6,
        borderPadding=5,
    ),
    "caption": _style("caption", 7.6, spaceBefore=3, spaceAfter=9),
    "table caption": _style("table caption", 7.6, spaceBefore=6, spaceAfter=3),
    "cell": _style("cell", 7.0, leading=8.8),
    "cell right": _style("cell right", 7.0, leading=8.8, alignment=2),
    "head": _style("head", 7.0, leading=8.8, fontName=f"{FONT}-B"),
    "head right": _style("head right", 7.0, leading=8.8, fontName=f"{FONT}-B", alignment=2),
    "listing": _style("listing", 6.8, fontName=f"{FONT}-M", leading=8.6),
    "toc1": _style("toc1", 8.6, leftIndent=0, spaceBefore=2),
    "toc2": _style("toc2", 8.0, leftIndent=14),
}


class _Place(Flowable):
    """Keeps room for a figure and remembers where that is."""

    def __init__(self, key: str, height: float, places: dict[str, Any]) -> None:
        super().__init__()
        self.key, self.width, self.height, self.places = key, WIDTH, height, places

    def wrap(self, *_: float) -> tuple[float, float]:
        """Say how large it is."""
        return self.width, self.height

    def draw(self) -> None:
        """Note the page and the lower left corner; a later pass overwrites an earlier one."""
        x, y = self.canv.absolutePosition(0, 0)
        self.places[self.key] = (self.canv.getPageNumber() - 1, x, y)


class _Pages(BaseDocTemplate):
    """Pages with a foot, an outline and a table of contents."""

    def __init__(self, out: io.BytesIO, memo: Memo) -> None:
        super().__init__(
            out,
            pagesize=A4,
            leftMargin=LEFT,
            rightMargin=LEFT,
            topMargin=TOP,
            bottomMargin=BOTTOM,
            title=f"{memo.title}. {memo.subtitle}",
            invariant=1,
        )
        self.memo = memo
        self.last = 0
        frame = Frame(LEFT, BOTTOM, WIDTH, A4[1] - TOP - BOTTOM, 0, 0, 0, 0, id="text")
        self.addPageTemplates(PageTemplate(frames=[frame], onPage=self._foot))

    def _foot(self, canvas: Any, _: Any) -> None:
        canvas.saveState()
        canvas.setFont(FONT, 6.8)
        canvas.setStrokeColor(RULE)
        canvas.line(LEFT, 14 * mm, A4[0] - LEFT, 14 * mm)
        canvas.drawString(LEFT, 10 * mm, self.memo.footer)
        page = canvas.getPageNumber()
        text = phrases.PAGE.format(n=page, of=self.last or page)
        canvas.drawRightString(A4[0] - LEFT, 10 * mm, text)
        canvas.restoreState()

    def afterFlowable(self, flowable: Any) -> None:
        """Tell the table of contents and the outline of each heading."""
        level = {"h1": 0, "h2": 1}.get(getattr(getattr(flowable, "style", None), "name", ""))
        if level is None or not hasattr(flowable, "key"):
            return
        text = flowable.getPlainText()
        self.canv.bookmarkPage(flowable.key)
        self.canv.addOutlineEntry(text, flowable.key, level, closed=level == 0)
        self.notify("TOCEntry", (level, escape(text), self.page, flowable.key))

    def afterPage(self) -> None:
        """Count the pages for the next pass."""
        self.last = max(self.last, self.page)


class _Writer:
    """Turns blocks into flowables."""

    def __init__(self, memo: Memo, drawings: Drawings) -> None:
        self.memo, self.drawings = memo, drawings
        self.labels = number([*memo.summary, *memo.blocks])
        self.places: dict[str, Any] = {}
        self.pictures: dict[str, Picture] = {}

    def build(self) -> bytes:
        """Lay the pages out, with empty room for figures."""
        out = io.BytesIO()
        story: list[Any] = [
            Paragraph(escape(self.memo.title), STYLES["title"]),
            Paragraph(self._marked(self.memo.subtitle), STYLES["subtitle"]),
            self._facts(),
            Paragraph(phrases.AT_A_GLANCE, STYLES["h1"]),
        ]
        for block in self.memo.summary:
            story += self._block(block)
        if any(isinstance(b, Heading) for b in self.memo.blocks):
            contents = TableOfContents(
                levelStyles=[STYLES["toc1"], STYLES["toc2"]], dotsMinLevel=-1
            )
            story += [Paragraph(phrases.CONTENTS, STYLES["h1"]), contents]
            story.append(CondPageBreak(A4[1]))
        for block in self.memo.blocks:
            story += self._block(block)
        _Pages(out, self.memo).multiBuild(story)
        return out.getvalue()

    def _marked(self, text: str) -> str:
        parts = []
        for span in spans(text, self.labels):
            words = escape(span.text)
            if span.target:
                words = f"<a href={quoteattr('#' + span.target)} color='#22446a'>{words}</a>"
            parts.append(f"<b>{words}</b>" if span.bold else words)
        return "".join(parts)

    def _facts(self) -> Any:
        rows = [
            [Paragraph(self._marked(k), STYLES["head"]), Paragraph(self._marked(v), STYLES["cell"])]
            for k, v in self.memo.facts
        ]
        table = LongTable(rows, colWidths=[0.26 * WIDTH, 0.74 * WIDTH])
        table.setStyle(
            TableStyle(
                [
                    ("LINEABOVE", (0, 0), (-1, 0), 1.0, INK),
                    ("LINEBELOW", (0, 0), (-1, -1), 0.3, RULE),
                    ("LINEBELOW", (0, -1), (-1, -1), 1.0, INK),
                    ("VALIGN", (0, 0), (-1, -1), "TOP"),
                    ("TOPPADDING", (0, 0), (-1, -1), 2),
                    ("BOTTOMPADDING", (0, 0), (-1, -1), 2),
                ]
            )
        )
        return table

    def _block(self, block: Block) -> list[Any]:
        if isinstance(block, Heading):
            return self._heading(block)
        if isinstance(block, Text):
            style = "lead" if block.text.endswith(":") else "text"
            return [Paragraph(self._marked(block.text), STYLES[style])]
        if isinstance(block, Note):
            return [Paragraph(self._marked(block.text), STYLES["note"])]
        if isinstance(block, Bullets):
            return [
                *(
                    Paragraph(self._marked(t), STYLES["bullet"], bulletText="•")
                    for t in block.items
                ),
                Spacer(1, 3),
            ]
        if isinstance(block, Table):
            return self._table(block)
        if isinstance(block, Picture):
            return [self._picture(block)]
        return [Preformatted(_folded(block.text), STYLES["listing"]), Spacer(1, 6)]

    def _heading(self, block: Heading) -> list[Any]:
        label = self.labels[block.key].rsplit(" ", 1)[-1]
        text = f"<a name={quoteattr(block.key)}/>{label}&nbsp;&nbsp;{self._marked(block.text)}"
        paragraph = Paragraph(text, STYLES[f"h{block.level}"])
        paragraph.key = block.key
        return [CondPageBreak((175 if block.roomy else 55) * mm), paragraph]

    def _caption(self, block: Table | Picture, style: str) -> Any:
        caption = phrases.CAPTION.format(
            label=f"<b>{self.labels[block.key]}</b>", text=self._marked(block.caption)
        )
        return Paragraph(f"<a name={quoteattr(block.key)}/>{caption}", STYLES[style])

    def _picture(self, block: Picture) -> Any:
        self.pictures[block.key] = block
        height = WIDTH * self.drawings.aspect(block)
        return KeepTogether(
            [
                Spacer(1, 4),
                _Place(block.key, height, self.places),
                self._caption(block, "caption"),
            ]
        )

    def _table(self, block: Table) -> list[Any]:
        total = sum(c.share for c in block.columns)
        widths = [WIDTH * c.share / total for c in block.columns]
        ends = [" right" if c.align == "right" else "" for c in block.columns]
        rows = [
            [
                Paragraph(self._marked(c.title), STYLES[f"head{end}"])
                for c, end in zip(block.columns, ends, strict=True)
            ]
        ]
        rows += [
            [
                Paragraph(self._marked(text), STYLES[f"cell{end}"])
                for text, end in zip(row, ends, strict=True)
            ]
            for row in block.rows
        ]
        table = LongTable(rows, colWidths=widths, repeatRows=1)
        table.setStyle(
            TableStyle(
                [
                    ("BACKGROUND", (0, 0), (-1, 0), SHADE),
                    ("LINEABOVE", (0, 0), (-1, 0), 0.8, INK),
                    ("LINEBELOW", (0, 0), (-1, 0), 0.5, INK),
                    ("LINEBELOW", (0, 1), (-1, -1), 0.25, RULE),
                    ("LINEBELOW", (0, -1), (-1, -1), 0.8, INK),
                    ("VALIGN", (0, 0), (-1, -1), "TOP"),
                    ("LEFTPADDING", (0, 0), (-1, -1), 3),
                    ("RIGHTPADDING", (0, 0), (-1, -1), 3),
                    ("TOPPADDING", (0, 0), (-1, -1), 2),
                    ("BOTTOMPADDING", (0, 0), (-1, -1), 2),
                ]
            )
        )
        return [CondPageBreak(35 * mm), self._caption(block, "table caption"), table, Spacer(1, 8)]


def _folded(text: str) -> str:
    """Lines of a listing cut to the width of the page."""
    lines = []
    for line in text.splitlines():
        lines += [line[i : i + LINE] for i in range(0, len(line), LINE)] or [""]
    return "\n".join(lines)


def _lay_in(writer: PdfWriter, page: Any, figure: bytes, key: str, x: float, y: float) -> None:
    """Put a figure's page on a page as a form, untouched, with its lower left corner at (x, y)."""
    source = PdfReader(io.BytesIO(figure)).pages[0]
    form = DecodedStreamObject()
    form.set_data(source.get_contents().get_data())
    form.update(
        {
            NameObject("/Type"): NameObject("/XObject"),
            NameObject("/Subtype"): NameObject("/Form"),
            NameObject("/BBox"): source.mediabox.clone(writer),
            NameObject("/Resources"): source["/Resources"].clone(writer),
        }
    )
    name = NameObject(f"/{key}")
    resources = page["/Resources"].get_object()
    forms = resources.setdefault(NameObject("/XObject"), DictionaryObject()).get_object()
    forms[name] = writer._add_object(form.flate_encode())
    scale = WIDTH / float(source.mediabox.width)
    put = DecodedStreamObject()
    put.set_data(f"q {scale:.6f} 0 0 {scale:.6f} {x:.3f} {y:.3f} cm {name} Do Q\n".encode())
    old = page["/Contents"]
    parts = old if isinstance(old, ArrayObject) else [page.raw_get("/Contents")]
    page[NameObject("/Contents")] = ArrayObject([*parts, writer._add_object(put)])


def _put_figures_in(
    plain: bytes, places: dict[str, Any], drawings: Drawings, memo: Memo, now: datetime
) -> bytes:
    """Lay the figures' own PDF pages into the room kept for them."""
    writer = PdfWriter(clone_from=PdfReader(io.BytesIO(plain)))
    for block in (*memo.summary, *memo.blocks):
        if not isinstance(block, Picture):
            continue
        page, x, y = places[block.key]
        _lay_in(writer, writer.pages[page], drawings.data(block, "pdf"), block.key, x, y)
    stamp = now.strftime("D:%Y%m%d%H%M%S%z")
    writer.add_metadata(
        {
            "/Title": f"{memo.title}. {memo.subtitle}",
            "/Producer": "causticload",
            "/Creator": "causticload",
            "/Author": "",
            "/CreationDate": f"{stamp[:-2]}'{stamp[-2:]}'",
            "/ModDate": f"{stamp[:-2]}'{stamp[-2:]}'",
        }
    )
    out = io.BytesIO()
    writer.write(out)
    return out.getvalue()
