"""Wrong files by the thousand: each ends as a record or as sentences with file and line, and nothing else.

Not part of the normal run: ``python tests/long/fuzz.py [CASES] [SEED] [EVERY]`` (20000, 1, 100 by default).
Valid files are edited at random, others are made of bytes, of brackets, of huge numbers, of characters that
look like others. What loads goes through the program: targets and instruments always, one night of a request
in one case of five, all of its nights in one of EVERY. While a case runs, nothing may be written, started,
imported, compiled or connected to, and time and memory are bounded. `tests/trust/test_fuzz.py` runs some of
it in the normal run.
"""

from __future__ import annotations

import random
import resource
import signal
import sys
import tempfile
import time
import traceback
from collections import Counter
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path

from coldglow.answers import check, expose, glow, hours, sky
from coldglow.describe.load import load_any
from coldglow.describe.records import Instrument, Request, Target
from coldglow.errors import ColdglowError, DescriptionError, NotFoundError

ROOT = Path(__file__).parents[2]
FILES = [
    path.read_bytes()
    for folder in ("targets", "instruments", "examples")
    for path in sorted((ROOT / folder).glob("*.yaml"))
]
MARKS = (
    ": | - |#|'|\"|[|]|{|}|,|&a |*a |!!str |!!python/object/apply:os.system [echo]|<<: *a|---\n|...\n|? |%"
)
VALUES = (
    "nan|NaN K|inf|-inf|infinity m|1e999|1e999 m|-1|0|0 m|none|~|yes|1e-400 m|9 m99|2027-02-30|1:2:3|[[[["
    "|}}}}|{a: 1}|[1, 2]|0001-01-01|9999-12-31|2027-01-01 to 2054-05-18|2027-01-02 to 2027-01-01|100000|10000"
    "|1e5 K|1e300 m|-500 K|120 K|1501 K|3000 K|1 K|1e25 m-2|1e-5 m-2|1e18 m-2|0.5 mm|60 mm|50 m|0.001 m"
    "|1e6 arcsec|0 deg|90 deg|-90 deg|180 deg|360 deg|0 %|100 %|101 %|1 s|1e9 s|10 s|3600 s|72|1"
    "|../../etc/passwd|/dev/zero"
)
ALIKE = (
    "\uff15\uff10\uff10 K|\u0663 K|\u22125 K|1\u00a0K|1\u200bK|\u00bd m|\uff11|\u216b|\u043e|\u0435|\u2170"
    "|\u00b5|\u03bc|\u017f|\u212a|\u212b|\u202e|\ufeff|\u2028|\ud7ff|\U0001d7d7 m|uranu\u0455"
)
BYTES = [b"@", b"`", b"\t", b"\n", b"\r", b"\x00", b"\xff", b"\xc3", b"9" * 1000, b"[" * 1000, b"a: " * 300]
ODD = [text.encode() for group in (MARKS, VALUES, ALIKE) for text in group.split("|")] + BYTES

SECONDS, BYTES_MOST = (
    60,
    4 << 30,
)  # a case may take; a season of three years in the finest steps is one of them
FORBIDDEN = (
    *(
        "socket.connect",
        "socket.bind",
        "subprocess.Popen",
        "os.system",
        "os.exec",
        "os.posix_spawn",
        "os.fork",
    ),
    *("os.remove", "os.rename", "os.mkdir", "os.rmdir", "os.chmod", "os.symlink", "os.link", "os.truncate"),
    *("shutil.rmtree", "shutil.move", "shutil.copyfile", "urllib.Request", "ctypes.dlopen"),
)
EXECUTION = ("exec", "compile", "import")
watched: list[tuple[str, ...]] = []  # events that are refused while a case runs


def _watch(event: str, details: tuple) -> None:
    """Refuse, while a case runs, whatever reaches beyond this process."""
    if not watched:
        return
    writes = event == "open" and isinstance(details[1], str) and set(details[1]) & set("wax+")
    if (writes and "writing" not in watched[-1]) or event in watched[-1]:
        raise AssertionError(f"a case tried {event} {details[:2]}")


sys.addaudithook(_watch)


def _late(number: int, frame: object) -> None:
    raise TimeoutError(f"a case took more than {SECONDS} s")


@contextmanager
def guarded(forbidden: tuple[str, ...], writing: bool = False) -> Iterator[None]:
    """Run the body with the events refused, files written if allowed, and not for longer than `SECONDS`."""
    signal.signal(signal.SIGALRM, _late)
    signal.alarm(SECONDS)
    watched.append((*forbidden, "writing") if writing else forbidden)
    try:
        yield
    finally:
        watched.pop()
        signal.alarm(0)


def edited(choose: random.Random) -> bytes:
    """Return one of the files after some edits of bytes, pieces, lines or values."""
    text = choose.choice(FILES)
    for _ in range(choose.choice([1, 1, 1, 2, 4])):
        at, length = choose.randrange(len(text) + 1), choose.choice([0, 1, 1, 2, 8, 60])
        kind = choose.randrange(8)
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
        elif kind == 4:
            text = _digit(text, choose)
        else:
            lines = text.split(b"\n")
            at = choose.randrange(len(lines))
            key, _, rest = lines[at].partition(b":")
            unit = rest.strip().partition(b" ")[2]
            value = choose.choice(ODD) + (b" " + unit if unit and choose.random() < 0.5 else b"")
            lines[at] = key + b": " + value
            text = b"\n".join(lines)
    return text


def _digit(text: bytes, choose: random.Random) -> bytes:
    """Return the text with one digit another, which mostly leaves a file that can be read."""
    places = [at for at, letter in enumerate(text) if 48 <= letter <= 57]
    if not places:
        return text
    at = choose.choice(places)
    return text[:at] + choose.choice([b"0", b"1", b"9", b"99", b"-1", b"1e3", b""]) + text[at + 1 :]


def made_up(choose: random.Random) -> bytes:
    """Return a file that comes from none: bytes, nesting, repetition, a format line above nonsense."""
    kind = choose.randrange(6)
    head = b"format: coldglow-%s/1\n" % choose.choice([b"target", b"instrument", b"request"])
    if kind == 0:
        return choose.randbytes(choose.choice([0, 1, 10, 1000, 100000]))
    if kind == 1:
        opening = choose.choice([b"[", b"{a: ", b"- ", b"a:\n ", b"? ", b"!!set {"])
        return head + b"name: " + opening * choose.choice([10, 100, 5000, 200000])
    if kind == 2:
        depth = choose.choice([5, 50, 300])
        return head + b"".join(b" " * level + b"a%d:\n" % level for level in range(depth))
    if kind == 3:
        keys = [b"name", b"dates", b"goal", b"target", b"instruments", b"coverage", b"emission", b"limits"]
        return head + b"\n".join(choose.choice(keys) + b": " + choose.choice(ODD) for _ in range(8))
    if kind == 4:
        return head + b"name: x\n" * choose.choice([2, 1000, 100000])
    return head + choose.choice(ODD) * choose.choice([1, 10, 1000])


def case(choose: random.Random) -> bytes:
    """Return the bytes of one file."""
    return edited(choose) if choose.random() < 0.85 else made_up(choose)


def read(path: Path) -> tuple[str, Target | Instrument | Request | None]:
    """Return in a word how reading ended, and the record if it did well; other exceptions go through."""
    try:
        return "record", load_any(path)
    except DescriptionError as refused:
        problems = refused.problems
    except NotFoundError as refused:
        return f"not found{'' if str(refused) else ', without a word'}", None
    cited = all(
        problem.line >= 1 and problem.what and str(problem).startswith(f"{problem.file}:{problem.line}: ")
        for problem in problems
    )
    return "problems with file and line" if problems and cited else "FAULT: problems without a place", None


def use(record: Target | Instrument | Request, whole: bool) -> str:
    """Put a record through the program: one night, or the whole of it; return in a word how it ended."""
    try:
        if isinstance(record, Target):
            str(glow(record))
            return str(sky(record, site=(0.0, 0.0, 0.0), at=["2027-11-25T05:00"]).feasible)
        if isinstance(record, Instrument):
            return str(sky("uranus", instrument=record, at=["2027-11-25T05:00"]).feasible)
        if not whole:
            record = replace(
                record, dates=replace(record.dates, last=record.dates.first, offered=(), step_s=900.0)
            )
        answer = hours(record)
        answers = [answer, expose(record)] if answer.feasible else [answer]
        return str(all(len(str(one)) > 40 and one.feasible for one in answers))
    except ColdglowError as refused:
        return "refused in a sentence" if len(str(refused)) > 20 else f"FAULT: refused with {refused}"


def run(cases: int, seed: int, every: int, path: Path) -> tuple[Counter[str], float]:
    """Run the cases; return how they ended and the longest time that one took, in seconds."""
    choose, ended, slowest = random.Random(seed), Counter[str](), 0.0
    for record in [
        load_any(ROOT / "examples" / "uranus-season.yaml"),
        load_any("uranus"),
        load_any("echelle-8m"),
    ]:
        use(record, False)  # whatever is imported late is imported now
    read(ROOT / "examples" / "uranus-season.yaml")
    for number in range(cases):
        path.write_bytes(case(choose))
        started = time.perf_counter()
        try:
            with guarded((*FORBIDDEN, *EXECUTION)):
                word, record = read(path)
            ended[word] += 1
            if record is not None and (number % 5 == 0 or not isinstance(record, Request)):
                with guarded(FORBIDDEN):
                    ended[f"  used: {use(record, number % every == 0)}"] += 1
                    if number % every == 0:
                        str(check([path]))
        except Exception as fault:
            place = traceback.extract_tb(fault.__traceback__)[-1]
            where = f"{Path(place.filename).name}:{place.lineno}"
            word = f"FAULT {type(fault).__name__} in {where}: {str(fault)[:90]}"
            kept = path.with_name(f"fault-{len(ended)}-{number}.yaml")
            if not ended[word]:
                kept.write_bytes(path.read_bytes())
                print(f"case {number} of seed {seed}, kept as {kept}", file=sys.stderr)
                traceback.print_exception(fault)
            ended[word] += 1
        slowest = max(slowest, time.perf_counter() - started)
    return ended, slowest


def main(cases: int = 20000, seed: int = 1, every: int = 100) -> None:
    """Run the cases and print how they ended."""
    resource.setrlimit(resource.RLIMIT_AS, (BYTES_MOST, BYTES_MOST))
    ended, slowest = run(cases, seed, every, Path(tempfile.mkdtemp()) / "case.yaml")
    peak_mb = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    print(f"{cases} cases, seed {seed}: slowest {slowest:.2f} s, most memory {peak_mb:.0f} MB")
    for word, count in sorted(ended.items()):
        print(f"{count:8d}  {word}")
    if any("FAULT" in word for word in ended):
        sys.exit(1)


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))
