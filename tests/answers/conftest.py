"""Let these tests import the stand-in of the online service and the independent places of the sky."""

import sys
from pathlib import Path

sys.path[:0] = [str(Path(__file__).parents[1] / folder) for folder in ("bridges", "sky")]
