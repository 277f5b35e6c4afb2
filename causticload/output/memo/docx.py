"""The memo for a word processor: real styles, numbered captions, references that follow them."""

from __future__ import annotations

import io
import zipfile
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from docx import Document
from docx.enum.style import WD_STYLE_TYPE
from docx.enum.text import WD_ALIGN_PARAGRAPH
from docx.oxml import parse_xml
from docx.oxml.ns import nsdecls, qn
from docx.shared import Mm, Pt, RGBColor

from causticload.output.memo import phrases
from causticload.output.memo.blocks import (
    Block,
    Bullets,
    Heading,
    Listing,
    Memo,
    Note,
    Picture,
    Table,
    Text,
    number,
    spans,
)
from causticload.output.memo.drawings import Drawings

MARGIN_MM = 20
WIDTH_MM = 170.0
FACE, MONO = "Arial", "Courier New"
INK, LINK = RGBColor(0x1A, 0x1A, 0x1A), RGBColor(0x22, 0x44, 0x6A)
# Paragraph styles: name, size in points, bold, space before and after in points.
STYLES = (
    ("Normal", 9.5, False, 0, 5),
    ("Title", 20, True, 0, 2),
    ("Subtitle", 12, False, 0, 8),
    ("Heading 1", 13.5, True, 14, 5),
    ("Heading 2", 11, True, 10, 4),
    ("Caption", 8.5, False, 3, 8),
    ("List Bullet", 9.5, False, 0, 3),
)
OWN_STYLES = (
    ("Table Text", 8, False, 1, 1),
    ("Table Head", 8, True, 1, 1),
    ("Notice", 9.5, False, 5, 8),
    ("Listing", 7.5, False, 0, 0),
    ("Contents", 9.5, False, 0, 1),
)
_EPOCH = (1980, 1, 1, 0, 0, 0)  # the first moment that a ZIP archive can tell


def write_docx(memo: Memo, drawings: Drawings, path: Path, *, now: datetime) -> None:
    """Write a memo as DOCX.

    Parameters
    ----------
    memo : Memo
        The memo.
    drawings : Drawings
        Its figures.
    path : Path
        Where to.
    now : datetime
        Time stamp in the file's properties.
    """
    out = io.BytesIO()
    _Writer(memo, drawings).document(now).save(out)
    path.write_bytes(_without_clock(out.getvalue()))


def _without_clock(data: bytes) -> bytes:
    """The same archive with one date on all its parts."""
    out = io.BytesIO()
    with (
        zipfile.ZipFile(io.BytesIO(data)) as old,
        zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as new,
    ):
        for item in old.infolist():
            part = zipfile.ZipInfo(item.filename, _EPOCH)
            part.compress_type = zipfile.ZIP_DEFLATED
            new.writestr(part, old.read(item.filename))
    return out.getvalue()


class _Writer:
    """Turns blocks into paragraphs and tables."""

    def __init__(self, memo: Memo, drawings: Drawings) -> None:
        self.memo, self.drawings = memo, drawings
        self.blocks = (*memo.summary, *memo.blocks)
        self.labels = number(self.blocks)
        self.marks = {key: f"m{i}" for i, key in enumerate(self.labels, start=1)}
        self.word = Document()

    def document(self, now: datetime) -> Any:
        """Make the document."""
        word = self.word
        section = word.sections[0]
        section.page_width, section.page_height = Mm(210), Mm(297)
        for side in ("left_margin", "right_margin", "top_margin", "bottom_margin"):
            setattr(section, side, Mm(MARGIN_MM))
        _set_styles(word)
        _number_headings(word)
        stamp = now.astimezone(UTC).replace(tzinfo=None)
        about = word.core_properties
        about.title = f"{self.memo.title}. {self.memo.subtitle}"
        about.author = about.last_modified_by = about.comments = ""
        about.created = about.modified = stamp
        word.add_paragraph(self.memo.title, style="Title")
        self._runs(word.add_paragraph(style="Subtitle"), self.memo.subtitle)
        self._grid([list(row) for row in self.memo.facts], (0.26, 0.74), ("left", "left"), head=0)
        plain = word.add_paragraph(style="Heading 1")
        plain.add_run(phrases.AT_A_GLANCE)
        _no_number(plain)
        for block in self.memo.summary:
            self._block(block)
        if any(isinstance(b, Heading) for b in self.memo.blocks):
            self._contents()
        for block in self.memo.blocks:
            self._block(block)
        self._foot(section)
        return word

    def _runs(self, paragraph: Any, text: str, *, bold: bool = False) -> None:
        for span in spans(text, self.labels):
            if span.target:
                self._reference(paragraph, span.target, span.text)
            else:
                paragraph.add_run(span.text).bold = True if span.bold or bold else None

    def _reference(self, paragraph: Any, target: str, label: str) -> None:
        """A reference that the word processor keeps right: to a caption, or a heading's number."""
        if target.startswith("sec-"):
            word, number_text = label.rsplit(" ", 1)
            paragraph.add_run(f"{word} ")
            _field(paragraph, f"REF {self.marks[target]} \\r \\h", number_text)
        else:
            _field(paragraph, f"REF {self.marks[target]} \\h", label)

    def _block(self, block: Block) -> None:
        word = self.word
        if isinstance(block, Heading):
            paragraph = word.add_paragraph(style=f"Heading {block.level}")
            close = self._mark(paragraph, block.key)
            self._runs(paragraph, block.text)
            close()
        elif isinstance(block, (Text, Note)):
            style = "Notice" if isinstance(block, Note) else "Normal"
            self._runs(word.add_paragraph(style=style), block.text)
        elif isinstance(block, Bullets):
            for text in block.items:
                self._runs(word.add_paragraph(style="List Bullet"), text)
        elif isinstance(block, Table):
            self._caption(block).paragraph_format.keep_with_next = True
            rows = [[c.title for c in block.columns], *(list(r) for r in block.rows)]
            total = sum(c.share for c in block.columns)
            self._grid(
                rows,
                tuple(c.share / total for c in block.columns),
                tuple(c.align for c in block.columns),
                head=1,
            )
        elif isinstance(block, Picture):
            self._picture(block)
        elif isinstance(block, Listing):
            for line in block.text.splitlines():
                word.add_paragraph(line, style="Listing")
            word.add_paragraph()

    def _mark(self, paragraph: Any, key: str) -> Any:
        """Open a bookmark; call what comes back to close it."""
        name = self.marks[key]
        number_text = name.removeprefix("m")
        space = nsdecls("w")
        paragraph._p.append(
            parse_xml(f'<w:bookmarkStart {space} w:id="{number_text}" w:name="{name}"/>')
        )
        return lambda: paragraph._p.append(
            parse_xml(f'<w:bookmarkEnd {space} w:id="{number_text}"/>')
        )

    def _caption(self, block: Table | Picture) -> Any:
        label = self.labels[block.key]
        word, number_text = label.rsplit(" ", 1)
        paragraph = self.word.add_paragraph(style="Caption")
        close = self._mark(paragraph, block.key)
        paragraph.add_run(f"{word} ").bold = True
        _field(paragraph, f"SEQ {word} \\* ARABIC", number_text, bold=True)
        close()
        self._runs(paragraph, f". {block.caption}")
        return paragraph

    def _picture(self, block: Picture) -> None:
        paragraph = self.word.add_paragraph()
        paragraph.paragraph_format.keep_with_next = True
        shape = paragraph.add_run().add_picture(
            io.BytesIO(self.drawings.data(block, "png")), width=Mm(WIDTH_MM)
        )
        about = shape._inline.docPr
        about.set("descr", f"{block.alt}: {_plain(block.caption, self.labels)}")
        about.set("title", self.labels[block.key])
        self._caption(block)

    def _grid(
        self, rows: list[list[str]], shares: tuple[float, ...], ends: tuple[str, ...], *, head: int
    ) -> None:
        table = self.word.add_table(rows=len(rows), cols=len(shares), style="Memo Table")
        table.autofit = False
        widths = [Mm(WIDTH_MM * s) for s in shares]
        for column, width in zip(table.columns, widths, strict=True):
            column.width = width
        for i, (row, texts) in enumerate(zip(table.rows, rows, strict=True)):
            cells = row.cells
            for k, text in enumerate(texts):
                cells[k].width = widths[k]
                paragraph = cells[k].paragraphs[0]
                is_head = i < head or (not head and k == 0)
                # By its id: looking styles up by name takes longer than all the rest.
                paragraph._p.style = "TableHead" if is_head else "TableText"
                if ends[k] == "right":
                    paragraph.alignment = WD_ALIGN_PARAGRAPH.RIGHT
                self._runs(paragraph, text)
            properties = row._tr.get_or_add_trPr()
            properties.append(parse_xml(f"<w:cantSplit {nsdecls('w')}/>"))
            if i < head:
                properties.append(parse_xml(f"<w:tblHeader {nsdecls('w')}/>"))
        self.word.add_paragraph().paragraph_format.space_after = Pt(2)

    def _contents(self) -> None:
        """A table of contents without page numbers: right as it stands, and updated on request."""
        head = self.word.add_paragraph(style="Heading 1")
        head.add_run(phrases.CONTENTS)
        _no_number(head)
        headings = [b for b in self.memo.blocks if isinstance(b, Heading)]
        for i, block in enumerate(headings):
            paragraph = self.word.add_paragraph(style="Contents")
            paragraph.paragraph_format.left_indent = Mm(6 * (block.level - 1))
            if i == 0:
                _field_part(paragraph, "begin")
                _field_code(paragraph, 'TOC \\o "1-2" \\n \\h')
                _field_part(paragraph, "separate")
            number_text = self.labels[block.key].rsplit(" ", 1)[-1]
            title = _plain(block.text, self.labels)
            link = parse_xml(f'<w:hyperlink {nsdecls("w")} w:anchor="{self.marks[block.key]}"/>')
            run = paragraph.add_run(f"{number_text}  {title}")
            link.append(run._r)
            paragraph._p.append(link)
            if i == len(headings) - 1:
                _field_part(paragraph, "end")
        headings_end = self.word.paragraphs[-1]
        headings_end.paragraph_format.space_after = Pt(10)

    def _foot(self, section: Any) -> None:
        paragraph = section.footer.paragraphs[0]
        paragraph.paragraph_format.tab_stops.add_tab_stop(Mm(WIDTH_MM), alignment=2)
        paragraph.style.font.size = Pt(7.5)
        paragraph.add_run(f"{self.memo.footer}\t")
        before, middle, after = phrases.PAGE.replace("{of}", "{n}").split("{n}")
        paragraph.add_run(before)
        _field(paragraph, "PAGE", "1")
        paragraph.add_run(middle)
        _field(paragraph, "NUMPAGES", "1")
        paragraph.add_run(after)


def _plain(text: str, labels: dict[str, str]) -> str:
    return "".join(span.text for span in spans(text, labels))


def _field(paragraph: Any, code: str, result: str, *, bold: bool = False) -> None:
    """A field with the result that it has now."""
    _field_part(paragraph, "begin")
    _field_code(paragraph, code)
    _field_part(paragraph, "separate")
    paragraph.add_run(result).bold = True if bold else None
    _field_part(paragraph, "end")


def _field_part(paragraph: Any, kind: str) -> None:
    run = paragraph.add_run()
    run._r.append(parse_xml(f'<w:fldChar {nsdecls("w")} w:fldCharType="{kind}"/>'))


def _field_code(paragraph: Any, code: str) -> None:
    run = paragraph.add_run()
    run._r.append(
        parse_xml(f'<w:instrText {nsdecls("w")} xml:space="preserve"> {code} </w:instrText>')
    )


def _set_styles(word: Any) -> None:
    styles = word.styles
    for name, *_ in OWN_STYLES:
        style = styles.add_style(name, WD_STYLE_TYPE.PARAGRAPH)
        style.base_style = styles["Normal"]
    for name, size, bold, before, after in (*STYLES, *OWN_STYLES):
        style = styles[name]
        face = MONO if name == "Listing" else FACE
        style.font.name, style.font.size, style.font.bold = face, Pt(size), bold
        style.font.italic, style.font.color.rgb = False, INK
        fonts = style.element.get_or_add_rPr().get_or_add_rFonts()
        for key in list(fonts.attrib):  # a theme's face would win over the named one
            if "Theme" in key or "theme" in key:
                del fonts.attrib[key]
        for kind in ("w:ascii", "w:hAnsi", "w:cs", "w:eastAsia"):
            fonts.set(qn(kind), face)
        style.paragraph_format.space_before = Pt(before)
        style.paragraph_format.space_after = Pt(after)
    border = styles["Title"].element.find(f".//{qn('w:pBdr')}")
    if border is not None:
        border.getparent().remove(border)
    _frame(styles["Notice"])
    styles.element.append(parse_xml(_TABLE_STYLE.format(space=nsdecls("w"))))


def _frame(style: Any) -> None:
    """A line around the paragraph and a light ground under it."""
    sides = "".join(
        f'<w:{side} w:val="single" w:sz="6" w:space="4" w:color="1A1A1A"/>'
        for side in ("top", "left", "bottom", "right")
    )
    properties = style.element.get_or_add_pPr()
    space = nsdecls("w")
    properties.insert_element_before(
        parse_xml(f"<w:pBdr {space}>{sides}</w:pBdr>"), "w:shd", "w:spacing", "w:ind", "w:jc"
    )
    properties.insert_element_before(
        parse_xml(f'<w:shd {space} w:val="clear" w:color="auto" w:fill="EEF0F2"/>'),
        "w:spacing",
        "w:ind",
        "w:jc",
    )


_TABLE_STYLE = (
    '<w:style {space} w:type="table" w:customStyle="1" w:styleId="MemoTable">'
    '<w:name w:val="Memo Table"/><w:basedOn w:val="TableNormal"/><w:uiPriority w:val="59"/>'
    "<w:tblPr><w:tblBorders>"
    '<w:top w:val="single" w:sz="8" w:space="0" w:color="1A1A1A"/>'
    '<w:bottom w:val="single" w:sz="8" w:space="0" w:color="1A1A1A"/>'
    '<w:insideH w:val="single" w:sz="2" w:space="0" w:color="8A8F96"/>'
    '</w:tblBorders><w:tblCellMar><w:left w:w="60" w:type="dxa"/><w:right w:w="60" w:type="dxa"/>'
    "</w:tblCellMar></w:tblPr>"
    '<w:tblStylePr w:type="firstRow"><w:tcPr><w:shd w:val="clear" w:color="auto" '
    'w:fill="EEF0F2"/></w:tcPr></w:tblStylePr></w:style>'
)
_OUTLINE = (
    '<w:abstractNum {space} w:abstractNumId="90"><w:multiLevelType w:val="multilevel"/>'
    '<w:lvl w:ilvl="0"><w:start w:val="1"/><w:numFmt w:val="decimal"/><w:pStyle '
    'w:val="Heading1"/><w:suff w:val="space"/><w:lvlText w:val="%1 "/><w:lvlJc w:val="left"/>'
    '<w:pPr><w:ind w:left="0" w:firstLine="0"/></w:pPr></w:lvl>'
    '<w:lvl w:ilvl="1"><w:start w:val="1"/><w:numFmt w:val="decimal"/><w:pStyle '
    'w:val="Heading2"/><w:suff w:val="space"/><w:lvlText w:val="%1.%2 "/><w:lvlJc '
    'w:val="left"/><w:pPr><w:ind w:left="0" w:firstLine="0"/></w:pPr></w:lvl></w:abstractNum>'
)


def _number_headings(word: Any) -> None:
    """Number headings by their styles, so that an added one renumbers the rest."""
    numbering = word.part.numbering_part.element
    outline = parse_xml(_OUTLINE.format(space=nsdecls("w")))
    first = numbering.find(qn("w:num"))
    first.addprevious(outline)
    numbering.append(
        parse_xml(f'<w:num {nsdecls("w")} w:numId="90"><w:abstractNumId w:val="90"/></w:num>')
    )
    for level in (1, 2):
        properties = word.styles[f"Heading {level}"].element.get_or_add_pPr()
        number_properties = properties.get_or_add_numPr()
        number_properties.get_or_add_ilvl().val = level - 1
        number_properties.get_or_add_numId().val = 90


def _no_number(paragraph: Any) -> None:
    """Take the number off one heading."""
    properties = paragraph._p.get_or_add_pPr().get_or_add_numPr()
    properties.get_or_add_numId().val = 0
