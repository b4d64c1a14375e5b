"""Command lines by the thousand: each ends with a status that is promised, none with an internal error.

Not part of the normal run: ``python tests/long/fuzz_words.py [CASES] [SEED]`` (3000 and 1 by default). Words
are drawn from commands, options, names, quantities and nonsense; requests of one night keep it quick.
Everything happens in an empty folder; writing is allowed below it and nowhere else.
"""

from __future__ import annotations

import io
import os
import random
import sys
import tempfile
import time
from collections import Counter
from contextlib import redirect_stderr, redirect_stdout
from pathlib import Path

from fuzz import ALIKE, VALUES, guarded

from coldglow import cli

ONE_NIGHT = """format: coldglow-request/1
name: one night
target: uranus
instruments: [{machine}]
dates:
  first: 2027-11-20
  last: 2027-11-20
  step: 15 min
goal:
  snr: 5
fade:
  first_year: 2027
  last_year: 2028
  trials: 20
"""
listed = str.split  # of many words in one text
TIMES = listed(
    "2027-11-20 2027-11-21 2027-11-20T03:00 2027-11-20T06:00Z 2027-11-20T05:00+14:00 1899-12-31 2054-01-01 "
    "2028-02-29 2027-02-29 2027-11-20T23:59:60 2027-W47 20271120 2027-11-20T25:00 9999-12-31 0001-01-01 now"
)
LENGTHS = listed("1h 5min 0h -1h 1e9s nan inf 30 1e-9s 40000d 1d 2027 6h")
SITE = listed("-70.4deg -24.6deg 2600m 0 90 -90 180 -180 360 1e9 nan 89.999999deg 1rad 8849m 10km -600m")
OPTIONS = {  # each with the words that may follow it
    "--temperature": listed("500K 0K -5K 1e5K nan 120 3000 inf 1e-300K 1e300 20"),
    "--column": ["2e15", "2e15 m-2", "0", "-1", "1e300", "nan", "1e25 cm-2", "1e11 cm-2"],
    "--band": listed("3.4um 4.1um 3.4 4.1 1um 10um 4.1um nan 0 -3um 3.95um 3.95um 3000nm 2500cm-1"),
    "--instrument": ["echelle-8m", "cold-space-ifu", "narrowband-3m", "no-such", "request.yaml", ""],
    "--instruments": ["echelle-8m", "cold-space-ifu", "narrowband-3m", "echele-8m", ""],
    "--site": SITE,
    "--from": TIMES,
    "--to": TIMES,
    "--at": TIMES,
    "--step": LENGTHS,
    "--for": LENGTHS,
    "--length": LENGTHS,
    "--longitudes": ["iau2015", "auroral", "iv", ""],
    "--years": listed("2027 2028 2027 2030 1850 2150 -5 nan"),
    "--out": ["out", "out/deeper", ".", "..", "/proc/x", "request.yaml", ""],
    "--write": ["a.csv", "a.ecsv", "a.json", "a.tex", "a.docx", "no/a.csv", "/proc/a.csv", ".csv", ""],
    "--target": ["uranus", "urans", "request.yaml", ""],
    "--jobs": ["1", "2", "0", "-1", "x"],
    "--force": [],
    "--strict": [],
    "--help": [],
    "--version": [],
    "-x": [],
    "-1": [],
    "--": [],
}
COUNTS = {"--site": 3, "--band": 2, "--years": 2}
PLAIN = listed(
    "uranus neptune jupiter saturn cold-giant echelle-8m cold-space-ifu narrowband-3m request.yaml "
    "other.yaml no.yaml 500K 2e15 m-2 3.4um 4.1um -70.4deg -24.6deg 2600m 2027-11-20T03:00 1h 5min 0.5 "
    "iau2015 auroral 2027 2028 1e99 out answer.csv answer.ecsv answer.json answer.tex "
    "answer.docx targets instruments"
)
WORDS = [
    *PLAIN,
    *VALUES.split("|"),
    *ALIKE.split("|"),
    "",
    " ",
    "-",
    "\n",
    "%s%n",
    "{0}",
    "$(id)",
    "`id`",
    "a" * 5000,
]
NEEDED = {  # words that make a command go further than its parser
    "plan": ["request.yaml", "--out", "out", "--force"],
    "glow": ["uranus"],
    "sky": ["uranus", "--instrument", "echelle-8m", "--at", "2027-11-20T03:00"],
    "draft": ["--target", "uranus", "--instrument", "echelle-8m"],
    "check": ["request.yaml"],
    "show": ["uranus"],
}
FORBIDDEN = ("socket.connect", "os.system", "os.exec", "os.posix_spawn", "subprocess.Popen", "urllib.Request")


def command_line(choose: random.Random) -> list[str]:
    """Return the words of one command line."""
    name = choose.choice([*cli.COMMANDS] * 5 + ["hour", "", "-x"])
    needed = list(NEEDED.get(name, ["request.yaml"])) if choose.random() < 0.9 else []
    for _ in range(choose.choice([0, 1, 1, 2, 3, 6])):
        word = choose.choice(WORDS)
        if choose.random() < 0.6:
            word = choose.choice([*OPTIONS] if choose.random() < 0.2 else _taken_by(name))
        values = (
            [choose.choice(OPTIONS[word]) for _ in range(COUNTS.get(word, 1))] if OPTIONS.get(word) else []
        )
        at = choose.choice([0, len(needed)])
        needed[at:at] = [word, *values]
    if needed and choose.random() < 0.15:
        needed[choose.randrange(len(needed))] = choose.choice(WORDS)
    return [name, *needed]


def _taken_by(name: str) -> list[str]:
    """Return the options that the command knows."""
    if name not in cli.COMMANDS:
        return [*OPTIONS]
    known = cli.build_parser(name).format_help()
    return [option for option in OPTIONS if option in known]


def outside(folder: Path) -> set[str]:
    """Return the names beside the working folder, which no case may change."""
    return {entry.name for entry in folder.parent.iterdir()}


def run(cases: int, seed: int, slow: int = 20) -> tuple[Counter[int], float]:
    """Run the cases in the working folder; return the statuses and the longest time of a case, in seconds.

    `plan`, `cover`, `nights` and `fade` take a second even for one night; of those that nothing refuses
    beforehand, one in `slow` is run.
    """
    folder = Path.cwd()
    for name, machine in (("request", "echelle-8m"), ("other", "cold-space-ifu")):
        (folder / f"{name}.yaml").write_text(ONE_NIGHT.format(machine=machine), encoding="utf-8")
    before = outside(folder)
    choose, ended, slowest = random.Random(seed), Counter[int](), 0.0
    for number in range(cases):
        words = command_line(choose)
        heavy = words[0] in ("plan", "cover", "nights", "fade", "compare")
        if heavy and "request.yaml" in words and choose.randrange(slow):
            words[words.index("request.yaml")] = "no.yaml"
        if words[0] == "fetch":
            continue
        started = time.perf_counter()
        out, err = io.StringIO(), io.StringIO()
        with guarded(FORBIDDEN, writing=True), redirect_stdout(out), redirect_stderr(err):
            status = cli.main(words)
        slowest = max(slowest, time.perf_counter() - started)
        said = err.getvalue()
        ended[status] += 1
        if status not in (0, 1, 2) or "Traceback" in said or (status == 2 and words[0] and not said.strip()):
            raise AssertionError(f"case {number} of seed {seed}: {words!r} ended with {status}\n{said}")
    assert outside(folder) == before, "something was written outside the working folder"
    return ended, slowest


def main(cases: int = 3000, seed: int = 1) -> None:
    """Run the cases and print how they ended."""
    os.chdir(tempfile.mkdtemp(dir=tempfile.mkdtemp()))
    ended, slowest = run(cases, seed)
    print(f"{cases} command lines, seed {seed}: slowest {slowest:.2f} s")
    for status, count in sorted(ended.items()):
        print(f"{count:8d}  status {status}")


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))
