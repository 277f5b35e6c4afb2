"""The add-on inside Blender, each check in a process of its own (see ``inside.py``).

Builds of the ``bpy`` package may crash or hang at exit while callbacks are registered, so a check
leaves without clean-up and is held to a time limit.
"""

import importlib.util
import json
import os
import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

from causticload.errors import InputError
from causticload.output.install import build_addon_zip, install_addon

HERE = Path(__file__).parent


def bpy_loads() -> bool:
    """Whether the package is there and finds the system libraries it wants."""
    if importlib.util.find_spec("bpy") is None:
        return False
    # Some builds crash or hang at exit: leave at once.
    code = "import bpy, os; os._exit(0)"
    return subprocess.run([sys.executable, "-c", code], capture_output=True).returncode == 0


needs_bpy = pytest.mark.skipif(
    not bpy_loads(),
    reason="the bpy package is not installed, or lacks a system library: pip install --no-deps bpy",
)


@needs_bpy
@pytest.mark.slow
@pytest.mark.parametrize(
    "check",
    [
        "geometry",
        "instant",
        "panels",
        "year",
        "cancel_and_kill",
        "variants_and_files",
        "two_scenes",
    ],
)
def test_inside(tmp_path: Path, check: str) -> None:
    target = tmp_path / "said.json"
    environment = {**os.environ, "CAUSTICLOAD_PYTHON": sys.executable}
    done = subprocess.run(
        [sys.executable, str(HERE / "inside.py"), check, str(target)],
        cwd=tmp_path,
        env=environment,
        capture_output=True,
        text=True,
        timeout=240,
        check=False,
    )
    assert target.exists(), done.stderr
    said = json.loads(target.read_text())
    assert said["ok"], said["text"]


def test_install_writes_the_way_to_this_engine(tmp_path: Path) -> None:
    (folder,) = install_addon("blender", into=tmp_path)
    assert json.loads((folder / "engine.json").read_text())["python"] == sys.executable
    assert "bl_info" in (folder / "__init__.py").read_text()
    with pytest.raises(InputError, match="no add-on"):
        install_addon("nonesuch", into=tmp_path)


def test_zip_has_both_forms(tmp_path: Path) -> None:
    with zipfile.ZipFile(build_addon_zip(tmp_path / "a.zip")) as archive:
        names = set(archive.namelist())
    assert {"causticload_addon/__init__.py", "causticload_addon/blender_manifest.toml"} <= names
    assert not any("engine.json" in n for n in names)  # one machine's path is not another's
