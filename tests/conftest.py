"""Settings for all tests."""

import sys
from pathlib import Path

from hypothesis import settings

# The same examples each time, here and in CI; no deadline, since kernels compile at first use.
settings.register_profile("fixed", derandomize=True, deadline=None)
settings.load_profile("fixed")

# Helpers that stand beside the tests of one package are imported by their plain names.
sys.path.insert(0, str(Path(__file__).parent / "light"))
