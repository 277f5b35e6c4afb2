"""Write the memo of a result folder in the formats asked for."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from datetime import datetime
from importlib.util import find_spec
from pathlib import Path

from causticload.errors import InputError
from causticload.output.files import working_in, write_whole
from causticload.output.memo.blocks import Memo
from causticload.output.memo.compose import compose
from causticload.output.memo.drawings import Drawings
from causticload.output.memo.evidence import Evidence

FORMATS = ("docx", "pdf", "html")
# What each format needs beyond the package's own needs.
_LIBRARIES = {"docx": ("docx",), "pdf": ("reportlab", "pypdf"), "html": ()}


def check_formats(formats: Sequence[str]) -> tuple[str, ...]:
    """Check that formats are known and can be written here.

    Parameters
    ----------
    formats : sequence of str
        Of docx, pdf, html.

    Returns
    -------
    formats : tuple of str
        Without repeats, in their own order.

    Raises
    ------
    InputError
        If one is unknown, none is given, or a library for one is not installed.
    """
    asked = tuple(dict.fromkeys(str(f).strip().lower() for f in formats))
    unknown = [f for f in asked if f not in FORMATS]
    if unknown or not asked:
        raise InputError(
            f"formats are {', '.join(FORMATS)}, got {', '.join(map(repr, unknown)) or 'none'}",
            where="formats",
            hint="For example --format docx,pdf.",
        )
    for name in asked:
        missing = [m for m in _LIBRARIES[name] if find_spec(m) is None]
        if missing:
            raise InputError(
                f"{name} cannot be written: the memo extra is not installed "
                f"({', '.join(missing)} missing)",
                where="formats",
                hint="Install it with: pip install 'causticload[memo]'. HTML needs nothing more.",
            )
    return asked


def write_memo(
    folder: str | Path, *, formats: Sequence[str] = FORMATS, now: datetime | None = None
) -> list[Path]:
    """Write the memo of a year from its result folder.

    Parameters
    ----------
    folder : str or Path
        Result folder of a year. The memo goes into it, copies of its figures into
        ``figures/memo``.
    formats : sequence of str
        Of docx, pdf, html.
    now : datetime, optional
        Time stamp of the memo, with its offset; the clock's if it is not given. The files are
        the same each time but for it.

    Returns
    -------
    paths : list of Path
        The files, in the order of the formats.

    Raises
    ------
    InputError
        If a format is unknown or its libraries are not installed.
    ResultError
        If the folder is missing, partial or of another schema, or cannot be written.
    """
    asked = check_formats(formats)
    evidence = Evidence(Path(folder))
    stamp = now if now is not None else datetime.now().astimezone()
    memo = compose(evidence, now=stamp)
    with working_in(evidence.folder):
        drawings = Drawings(evidence.folder / "figures" / "memo")
        return [
            write_one(
                memo, drawings, evidence.folder / f"memo.{name}", now=stamp, evidence=evidence
            )
            for name in asked
        ]


def available_formats() -> tuple[str, ...]:
    """Formats that can be written with what is installed.

    Returns
    -------
    formats : tuple of str
        HTML at least.
    """
    return tuple(f for f in FORMATS if all(find_spec(m) is not None for m in _LIBRARIES[f]))


def write_one(
    memo: Memo,
    drawings: Drawings,
    path: Path,
    *,
    now: datetime,
    evidence: Evidence | None = None,
) -> Path:
    """Write a memo in the format that a path's ending names.

    Parameters
    ----------
    memo : Memo
        The memo.
    drawings : Drawings
        Its figures.
    path : Path
        Where to; it ends in .docx, .pdf or .html.
    now : datetime
        Time stamp.
    evidence : Evidence, optional
        The year whose model turns in a page.

    Returns
    -------
    path : Path
        The same.

    Raises
    ------
    ResultError
        If it cannot be written.
    """
    write_whole(path, _writer(path.suffix, memo, drawings, evidence, now))
    return path


def _writer(
    suffix: str, memo: Memo, drawings: Drawings, evidence: Evidence | None, now: datetime
) -> Callable[[Path], None]:
    """The writer of a format; its libraries are read in only now."""
    if suffix == ".pdf":
        from causticload.output.memo.pdf import write_pdf

        return lambda p: write_pdf(memo, drawings, p, now=now)
    if suffix == ".docx":
        from causticload.output.memo.docx import write_docx

        return lambda p: write_docx(memo, drawings, p, now=now)
    from causticload.output.memo.html import write_html
    from causticload.output.memo.model3d import pack

    model = pack(evidence) if evidence is not None else ""
    return lambda p: write_html(memo, drawings, p, now=now, model=model)
