"""The memo as one page for a browser: tables sort, the model turns, and nothing is fetched."""

from __future__ import annotations

import base64
import hashlib
import json
from datetime import datetime
from html import escape
from importlib.resources import files
from pathlib import Path

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
from causticload.output.words import MONTHS

# The page may use what it carries, told by fingerprints, and may ask nobody for anything.
POLICY = (
    "default-src 'none'; img-src data:; style-src 'sha256-{style}'; script-src 'sha256-{script}'; "
    "base-uri 'none'; form-action 'none'"
)


def write_html(
    memo: Memo, drawings: Drawings, path: Path, *, now: datetime, model: str = ""
) -> None:
    """Write a memo as one page.

    Parameters
    ----------
    memo : Memo
        The memo.
    drawings : Drawings
        Its figures.
    path : Path
        Where to.
    now : datetime
        Time stamp in the page's head.
    model : str
        From :func:`causticload.output.memo.model3d.pack`; without it nothing turns.
    """
    path.write_text(_Writer(memo, drawings).page(now, model), encoding="utf-8", newline="\n")


def _fingerprint(text: str) -> str:
    return base64.b64encode(hashlib.sha256(text.encode()).digest()).decode()


class _Writer:
    """Turns blocks into elements."""

    def __init__(self, memo: Memo, drawings: Drawings) -> None:
        self.memo, self.drawings = memo, drawings
        self.labels = number([*memo.summary, *memo.blocks])

    def page(self, now: datetime, model: str) -> str:
        """Write the whole page."""
        m = self.memo
        here = files("causticload.output.memo") / "page"
        style = (here / "page.css").read_text(encoding="utf-8")
        script = (here / "page.js").read_text(encoding="utf-8")
        style, script = f"\n{style}", f"\n{script}"
        policy = POLICY.format(style=_fingerprint(style), script=_fingerprint(script))
        lines = [
            "<!DOCTYPE html>",
            '<html lang="en">',
            "<head>",
            '<meta charset="utf-8">',
            f'<meta http-equiv="Content-Security-Policy" content="{policy}">',
            '<meta name="viewport" content="width=device-width, initial-scale=1">',
            f'<meta name="date" content="{now.isoformat(timespec="minutes")}">',
            f"<title>{escape(m.subtitle)}</title>",
            f"<style>{style}</style>",
            "</head>",
            "<body>",
            f"<h1>{escape(m.title)}</h1>",
            f'<p class="subtitle">{self._marked(m.subtitle)}</p>',
            self._facts(),
            f"<h2>{phrases.AT_A_GLANCE}</h2>",
            *(self._block(b) for b in m.summary),
            *(self._turning(model) if model else ()),
            *self._contents(),
            *(self._block(b) for b in m.blocks),
            f"<footer>{escape(m.footer)}</footer>",
            f'<script type="application/json" id="months">{json.dumps(MONTHS)}</script>',
            f"<script>{script}</script>",
            "</body>",
            "</html>",
        ]
        return "\n".join(lines) + "\n"

    def _marked(self, text: str) -> str:
        parts = []
        for span in spans(text, self.labels):
            words = escape(span.text)
            if span.target:
                words = f'<a href="#{escape(span.target)}">{words}</a>'
            parts.append(f"<b>{words}</b>" if span.bold else words)
        return "".join(parts)

    def _facts(self) -> str:
        rows = "\n".join(
            f'<tr><th scope="row">{self._marked(k)}</th><td>{self._marked(v)}</td></tr>'
            for k, v in self.memo.facts
        )
        return f'<table class="facts">\n{rows}\n</table>'

    def _turning(self, model: str) -> tuple[str, ...]:
        return (
            f'<h2 class="screen">{phrases.VIEW_3D}</h2>',
            f'<p class="hint">{phrases.VIEW_3D_HELP}</p>',
            f'<canvas id="view" tabindex="0" role="img" aria-label="{phrases.VIEW_3D}"></canvas>',
            f'<p id="no-3d" class="note" hidden>{phrases.VIEW_3D_MISSING}</p>',
            f'<script type="text/plain" id="model">{model}</script>',
            f'<p class="hint">{phrases.SORT_HINT}</p>',
        )

    def _contents(self) -> tuple[str, ...]:
        items = [
            f'<li class="level{b.level}"><a href="#{b.key}">{self._numbered(b)}</a></li>'
            for b in self.memo.blocks
            if isinstance(b, Heading)
        ]
        if not items:
            return ()
        return (f"<h2>{phrases.CONTENTS}</h2>", "<nav><ol>", *items, "</ol></nav>")

    def _numbered(self, block: Heading) -> str:
        return f"{self.labels[block.key].rsplit(' ', 1)[-1]}&ensp;{self._marked(block.text)}"

    def _block(self, block: Block) -> str:
        if isinstance(block, Heading):
            level = block.level + 1
            return f'<h{level} id="{block.key}">{self._numbered(block)}</h{level}>'
        if isinstance(block, Text):
            return f"<p>{self._marked(block.text)}</p>"
        if isinstance(block, Note):
            return f'<p class="note">{self._marked(block.text)}</p>'
        if isinstance(block, Bullets):
            items = "\n".join(f"<li>{self._marked(t)}</li>" for t in block.items)
            return f"<ul>\n{items}\n</ul>"
        if isinstance(block, Table):
            return self._table(block)
        if isinstance(block, Picture):
            return self._picture(block)
        return f"<pre>{escape(block.text)}</pre>"

    def _caption(self, block: Table | Picture) -> str:
        label = f"<b>{self.labels[block.key]}</b>"
        return phrases.CAPTION.format(label=label, text=self._marked(block.caption))

    def _picture(self, block: Picture) -> str:
        data = base64.b64encode(self.drawings.data(block, "svg")).decode()
        alt = escape(f"{block.alt}: {self.labels[block.key]}")
        return (
            f'<figure id="{block.key}"><img alt="{alt}" src="data:image/svg+xml;base64,{data}">'
            f"<figcaption>{self._caption(block)}</figcaption></figure>"
        )

    def _table(self, block: Table) -> str:
        ends = [' class="right"' if c.align == "right" else "" for c in block.columns]
        heads = "".join(
            f'<th scope="col"{end}><button type="button">{self._marked(c.title)}</button></th>'
            for c, end in zip(block.columns, ends, strict=True)
        )
        rows = "\n".join(
            "<tr>"
            + "".join(
                f"<td{end}>{self._marked(text)}</td>" for text, end in zip(row, ends, strict=True)
            )
            + "</tr>"
            for row in block.rows
        )
        return (
            f'<p class="caption" id="{block.key}">{self._caption(block)}</p>\n'
            f'<div class="scroll"><table class="sorts"><thead><tr>{heads}</tr></thead>\n'
            f"<tbody>\n{rows}\n</tbody></table></div>"
        )
