"""Let these tests import `stand_in`, and what the tests of the sky share."""

import sys
from pathlib import Path

sys.path[:0] = [str(Path(__file__).parent), str(Path(__file__).parents[1] / "sky")]
