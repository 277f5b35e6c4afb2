"""One command checks everything, here and in CI: format, lint, types, imports, docstrings, tests.

python tests/check.py          all of it
python tests/check.py --fast   without the tests marked slow
"""

from __future__ import annotations

import os
import subprocess
import sys
import time
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
PYTHON = sys.executable


def modules() -> list[str]:
    """Files of the package whose public docstrings are held to numpydoc."""
    return [str(p.relative_to(ROOT)) for p in sorted((ROOT / "causticload").rglob("*.py"))]


def run(name: str, command: list[str]) -> bool:
    """Run one check and say how it went."""
    started = time.perf_counter()
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    code = subprocess.run(command, cwd=ROOT, env=environment, check=False).returncode
    print(f"[{'ok' if code == 0 else 'FAILED'}] {name}, {time.perf_counter() - started:.1f} s")
    return code == 0


def main() -> int:
    """Run all checks, also after one has failed."""
    tests = [PYTHON, "-m", "pytest", "-q", "-n", "2"]
    if "--fast" in sys.argv[1:]:
        tests += ["-m", "not slow"]
    checks = {
        "format": [PYTHON, "-m", "ruff", "format", "--check", "."],
        "lint": [PYTHON, "-m", "ruff", "check", "."],
        "types": [PYTHON, "-m", "mypy"],
        "imports": [str(Path(PYTHON).with_name("lint-imports")), "--no-cache"],
        "docstrings": [PYTHON, "-m", "numpydoc.hooks.validate_docstrings", *modules()],
        "tests": tests,
    }
    results = [run(name, command) for name, command in checks.items()]
    return 0 if all(results) else 1


if __name__ == "__main__":
    sys.exit(main())
