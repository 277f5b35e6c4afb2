"""Put the add-on where a host program finds it, with the way back to this engine."""

from __future__ import annotations

import os
import sys
import zipfile
from collections.abc import Iterator
from importlib.util import find_spec
from pathlib import Path

from causticload.errors import InputError
from causticload.output.files import to_json, write_text, write_whole

NAME = "causticload_addon"
ENGINE = "engine.json"
HOSTS = ("blender",)


def _source() -> Path:
    """Folder of the add-on, which is installed beside the engine; it is found, not imported."""
    spec = find_spec(NAME)
    if spec is None or spec.origin is None:
        raise InputError(
            "this installation of causticload does not hold the add-on",
            where=NAME,
            hint="Install causticload again.",
        )
    return Path(spec.origin).parent


def _files(source: Path) -> list[Path]:
    return sorted(p for p in source.iterdir() if p.suffix in (".py", ".toml"))


def blender_folders() -> Iterator[Path]:
    """Folders of the versions of Blender that this user has run.

    Yields
    ------
    folder : Path
        Named after a version, such as ``4.2``.
    """
    if sys.platform == "win32":
        base = Path(os.environ.get("APPDATA", "")) / "Blender Foundation" / "Blender"
    elif sys.platform == "darwin":
        base = Path.home() / "Library" / "Application Support" / "Blender"
    else:
        base = Path(os.environ.get("XDG_CONFIG_HOME", Path.home() / ".config")) / "blender"
    if base.is_dir():
        yield from sorted(p for p in base.iterdir() if p.is_dir() and p.name[:1].isdigit())


def install_addon(host: str, *, into: Path | None = None) -> list[Path]:
    """Copy the add-on into a host program's folders and tell it which Python has the engine.

    Parameters
    ----------
    host : str
        ``blender``.
    into : Path, optional
        A folder of add-ons; by default those of all versions that this user has run.

    Returns
    -------
    folders : list of Path
        Where it was written.

    Raises
    ------
    InputError
        If the host is unknown or none of its folders is found.
    """
    if host not in HOSTS:
        raise InputError(
            f"there is no add-on for {host!r}", where="host", hint=f"Hosts: {', '.join(HOSTS)}."
        )
    source = _source()
    targets = [into] if into else [f / "scripts" / "addons" for f in blender_folders()]
    if not targets:
        raise InputError(
            "no folder of Blender is found",
            where="blender",
            hint="Start Blender once, or name its folder of add-ons.",
        )
    written = []
    for target in targets:
        folder = target / NAME
        for file in _files(source):
            text = file.read_text(encoding="utf-8")
            write_text(folder / file.name, text)
        write_text(folder / ENGINE, to_json({"python": sys.executable}))
        written.append(folder)
    return written


def build_addon_zip(path: str | Path) -> Path:
    """Write the add-on as one zip that installs as a legacy add-on and as an extension.

    Parameters
    ----------
    path : str or Path
        The zip file.

    Returns
    -------
    path : Path
        The same.
    """
    source = _source()

    def write(target: Path) -> None:
        with zipfile.ZipFile(target, "w", zipfile.ZIP_DEFLATED) as archive:
            for file in _files(source):
                archive.write(file, f"{NAME}/{file.name}")

    write_whole(Path(path), write)
    return Path(path)
