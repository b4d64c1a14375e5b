"""Many random edits of valid descriptions: each must give a record or problems with file and line.

Not part of the normal run: `python tests/long/fuzz_descriptions.py [CASES] [SEED]` (default 20000, 1).
Prints how many cases ended how, the slowest one, and stops with the text of any case that ends otherwise.
"""

import random
import sys
import tempfile
import time
from collections import Counter
from pathlib import Path

from coldglow.describe.load import load_any
from coldglow.errors import DescriptionError, NotFoundError

ROOT = Path(__file__).parents[2]
FILES = [
    path.read_bytes()
    for folder in ("targets", "instruments", "examples")
    for path in sorted((ROOT / folder).glob("*.yaml"))
]
MARKS = (
    b": | - |#|'|\"|[|]|{|}|,|&a |*a |!!str |---\n|...\n|? |%|@|`|\t|\n|\r|\x00|\xff|\xc3\xa9|\xe2\x88\x92"
)
VALUES = b"nan|inf|-inf|1e999|-1|0|none|~|yes|1e-400 m|9 m99|2027-02-30|1:2:3|[[[[|}}}}|{a: 1}|[1, 2]"
ODD = [*MARKS.split(b"|"), *VALUES.split(b"|"), b"9" * 1000, b"[" * 1000, b"a: " * 300]


def edited(choose):
    """Return one of the files after one or two edits of bytes, pieces or lines."""
    text = choose.choice(FILES)
    for _ in range(choose.randint(1, 2)):
        at, length = choose.randrange(len(text) + 1), choose.choice([0, 1, 1, 2, 8, 60])
        kind = choose.randrange(5)
        if kind == 0:
            text = text[:at] + text[at + length :]
        elif kind == 1:
            text = text[:at] + choose.choice(ODD) + text[at + length :]
        elif kind == 2:
            text = text[:at] + choose.randbytes(length) + text[at + length :]
        elif kind == 3:
            lines = text.split(b"\n")
            lines.insert(choose.randrange(len(lines) + 1), choose.choice(lines))
            text = b"\n".join(lines)
        else:
            key, colon, _ = (lines := text.split(b"\n"))[at := choose.randrange(len(lines))].partition(b":")
            lines[at] = key + colon + b" " + choose.choice(ODD)
            text = b"\n".join(lines)
    return text


def outcome(path):
    """Return in a word how reading ended; any exception that is not ours goes through."""
    try:
        load_any(path)
    except DescriptionError as refused:
        cited = all(problem.file and problem.line >= 1 and problem.what for problem in refused.problems)
        return "problems with file and line" if cited else "problems without a place"
    except NotFoundError:
        return "not found"
    return "record"


def main(cases, seed):
    """Run the cases and print the count."""
    choose, ended, slowest = random.Random(seed), Counter(), 0.0
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "case.yaml"
        for case in range(cases):
            path.write_bytes(edited(choose))
            started = time.perf_counter()
            try:
                ended[outcome(path)] += 1
            except Exception:
                sys.stdout.buffer.write(path.read_bytes())
                print(f"\ncase {case} of seed {seed}")
                raise
            slowest = max(slowest, time.perf_counter() - started)
    assert ended["problems without a place"] == 0
    print(f"{cases} cases, seed {seed}: {dict(ended)}; slowest {slowest:.2f} s")


if __name__ == "__main__":
    given = [int(word) for word in sys.argv[1:]]
    main(*(given + [20000, 1][len(given) :]))
