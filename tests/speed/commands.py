"""How long whole commands take, each as a ratio to a named baseline in the same run.

Not part of the normal test run: ``python tests/speed/commands.py``. The machine should have nothing else to
do; the median of five runs is quoted. Figures to reach on two cores: `--help` below 0.15 s, `hours` for a
season below 3 s, `cover` below 5 s, `plan` below 15 s and 600 MB.
"""

import resource
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

SEASON = str(Path(__file__).parents[2] / "examples" / "uranus-season.yaml")
RUNS = 5
BASELINES = {
    "bare interpreter": ["-c", "pass"],
    "import of astropy.coordinates": ["-c", "import astropy.coordinates"],
}
COMMANDS = {
    "--help": (["--help"], "bare interpreter", 0.15),
    "hours": (["hours", SEASON], "import of astropy.coordinates", 3.0),
    "cover": (["cover", SEASON], "import of astropy.coordinates", 5.0),
    "plan": (["plan", SEASON, "--out", "{folder}"], "import of astropy.coordinates", 15.0),
}


def seconds(words: list[str]) -> float:
    """Return the median wall time of a Python process with these arguments."""
    found = []
    for _ in range(RUNS):
        with tempfile.TemporaryDirectory() as folder:
            filled = [word.replace("{folder}", f"{folder}/plan") for word in words]
            start = time.perf_counter()
            subprocess.run([sys.executable, *filled], check=True, capture_output=True)
            found.append(time.perf_counter() - start)
    return statistics.median(found)


def main() -> None:
    """Print a line for each command."""
    base = {name: seconds(words) for name, words in BASELINES.items()}
    for name, value in base.items():
        print(f"{name:32} {value:7.3f} s   baseline")
    for name, (words, baseline, wanted) in COMMANDS.items():
        value = seconds(["-m", "coldglow.cli", *words])
        print(
            f"coldglow {name:23} {value:7.3f} s   {value / base[baseline]:6.1f} x {baseline}"
            f"   (to reach: {wanted} s, {'met' if value < wanted else 'MISSED'})"
        )
    peak = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss / 1024
    print(f"largest process {peak:.0f} MB (to reach: 600 MB)")


if __name__ == "__main__":
    main()
