"""Settings for all tests."""

import sys
from pathlib import Path

import pytest
from hypothesis import settings

# The same examples each time, here and in CI; no deadline, since kernels compile at first use.
settings.register_profile("fixed", derandomize=True, deadline=None)
settings.load_profile("fixed")

# Helpers that stand beside the tests of one package are imported by their plain names.
sys.path.insert(0, str(Path(__file__).parent / "light"))


def pytest_configure(config: pytest.Config) -> None:
    """Drop compiled kernels older than a kernel's source: numba looks at the caller's file only."""
    if hasattr(config, "workerinput"):  # one process does it for all
        return
    package = Path(__file__).parents[1] / "causticload"
    sources = [p.stat().st_mtime for p in package.rglob("*.py") if "njit" in p.read_text("utf-8")]
    for compiled in package.rglob("__pycache__/*.nb[ic]"):
        if compiled.stat().st_mtime < max(sources):
            compiled.unlink(missing_ok=True)
