"""Time to the first result in a fresh install: one instant with nothing compiled before.

    python tests/benchmarks/bench_first.py

Runs ``causticload instant`` on a sample with an empty cache of compiled kernels, and again with
the cache that the first run left.
"""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
import time
from pathlib import Path

from big_scenes import row

SAMPLE = Path(__file__).resolve().parents[2] / "sample_meshes" / "tower.toml"


def seconds(cache: str) -> float:
    """Time of one run of the command. [s]"""
    command = [str(Path(sys.executable).with_name("causticload")), "instant", str(SAMPLE)]
    started = time.perf_counter()
    subprocess.run(
        [*command, "--sun", "200,38", "--quiet"],
        env={**os.environ, "NUMBA_CACHE_DIR": cache},
        stdout=subprocess.DEVNULL,
        check=True,
    )
    return time.perf_counter() - started


def main() -> None:
    """Print the row."""
    with tempfile.TemporaryDirectory() as cache:
        first, again = seconds(cache), seconds(cache)
    figure = "first result in a fresh install (compilation included)"
    row(figure, "60 s", "20 s", f"{first:.1f} s; the second run {again:.1f} s")


if __name__ == "__main__":
    main()
