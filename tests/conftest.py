"""Settings for all tests."""

import sys
from pathlib import Path

# Helpers that stand beside the tests of one package are imported by their plain names.
sys.path.insert(0, str(Path(__file__).parent / "light"))
