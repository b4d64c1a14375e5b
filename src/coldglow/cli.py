"""The command line: words in, one answer out, an exit status.

Nothing heavy is imported until a command runs, so that `--help` answers at once.
"""

from __future__ import annotations

import argparse
import re
import sys
from collections.abc import Callable, Sequence
from contextlib import nullcontext
from dataclasses import dataclass
from typing import TYPE_CHECKING

from coldglow.completion import SHELLS, Kind, Option, Syntax, completion_script
from coldglow.encodings import allow_any_encoding
from coldglow.errors import ColdglowError
from coldglow.patience import teller, waiting

if TYPE_CHECKING:
    from coldglow.report.results import Result

TELL_THEMSELVES = ("plan", "fade", "compare")  # commands that say how far they are
DONE, NOT_FEASIBLE, WRONG_INPUT, INTERNAL, INTERRUPTED = 0, 1, 2, 70, 130

Add = Callable[[argparse.ArgumentParser], None]
Run = Callable[[argparse.Namespace], "Result | str"]


@dataclass(frozen=True, slots=True)
class Command:
    """One command: the question it answers, an example, its arguments and what runs it.

    `word` is the name of the one positional word that the command needs, or '' where it needs none or many.
    """

    question: str
    example: str
    word: str
    add: Add
    run: Run


class Parser(argparse.ArgumentParser):
    """argparse with wrong input as status 2 and one line that says where help is."""

    def error(self, message: str) -> None:  # type: ignore[override]
        """Print the mistake and leave with status 2."""
        self.exit(WRONG_INPUT, f"{self.prog}: {message}; `{self.prog} --help` lists what is accepted\n")


def request_word(parser: argparse.ArgumentParser) -> None:
    """Add the REQUEST word that most commands take."""
    parser.add_argument("word", nargs="*", metavar="REQUEST.yaml", help="path of the request")


def target_word(parser: argparse.ArgumentParser) -> None:
    """Add the TARGET word."""
    parser.add_argument("word", nargs="*", metavar="TARGET", help="name or path of a target")


def add_place(parser: argparse.ArgumentParser) -> None:
    """Add the two ways to say where the observer stands."""
    where = parser.add_mutually_exclusive_group(required=True)
    where.add_argument("--instrument", metavar="NAME", help="observe from this instrument, within its limits")
    where.add_argument(
        "--site",
        nargs=3,
        metavar=("LON", "LAT", "HEIGHT"),
        help="longitude (deg, east positive), latitude (deg), height (m)",
    )


def add_times(parser: argparse.ArgumentParser) -> None:
    """Add the two ways to say when."""
    parser.add_argument("--from", dest="first", metavar="DATE", help="first instant (UTC, ISO date or time)")
    parser.add_argument("--to", dest="last", metavar="DATE", help="last instant (UTC)")
    parser.add_argument("--step", default="1h", metavar="DT", help="step (bare number: minutes; default 1h)")
    parser.add_argument("--at", nargs="+", action="extend", metavar="TIME", help="these instants (UTC)")


def add_glow(parser: argparse.ArgumentParser) -> None:
    """Arguments of `glow`."""
    target_word(parser)
    parser.add_argument("--temperature", metavar="T", help="temperature (bare number: K)")
    parser.add_argument("--column", metavar="N", help="column along the line of sight (bare number: m-2)")
    parser.add_argument("--band", nargs=2, metavar=("FROM", "TO"), help="wavelengths (bare numbers: um)")


def run_glow(words: argparse.Namespace) -> Result:
    """Run `glow`."""
    from coldglow.answers import glow

    return glow(words.word, temperature=words.temperature, column_density=words.column, band=words.band)


def add_sky(parser: argparse.ArgumentParser) -> None:
    """Arguments of `sky`."""
    target_word(parser)
    add_place(parser)
    add_times(parser)
    parser.add_argument("--longitudes", metavar="SYSTEM", help="longitude system of the target")


def run_sky(words: argparse.Namespace) -> Result:
    """Run `sky`."""
    from coldglow.answers import sky

    return sky(
        words.word,
        instrument=words.instrument,
        site=words.site,
        first=words.first,
        last=words.last,
        step=words.step,
        at=words.at,
        longitudes=words.longitudes,
    )


def add_expose(parser: argparse.ArgumentParser) -> None:
    """Arguments of `expose`."""
    request_word(parser)
    parser.add_argument("--at", metavar="TIME", help="the moment (UTC); default: the median observable step")
    parser.add_argument("--for", dest="clock", metavar="DT", help="tell errors and limits after DT (bare: h)")
    parser.add_argument("--instrument", default="", metavar="NAME", help="one that the request names")


def run_expose(words: argparse.Namespace) -> Result:
    """Run `expose`."""
    from coldglow.answers import expose

    return expose(words.word, at=words.at, instrument=words.instrument, clock=words.clock)


def add_hours(parser: argparse.ArgumentParser) -> None:
    """Arguments of `hours`."""
    request_word(parser)
    parser.add_argument("--length", metavar="DT", help="best stretch of this length in each night (bare: h)")


def run_hours(words: argparse.Namespace) -> Result:
    """Run `hours`."""
    from coldglow.answers import hours

    return hours(words.word, length=words.length)


def run_cover(words: argparse.Namespace) -> Result:
    """Run `cover`."""
    from coldglow.answers import cover

    return cover(words.word)


def run_nights(words: argparse.Namespace) -> Result:
    """Run `nights`."""
    from coldglow.answers import nights

    return nights(words.word)


def add_fade(parser: argparse.ArgumentParser) -> None:
    """Arguments of `fade`."""
    request_word(parser)
    parser.add_argument("--years", nargs=2, type=int, metavar=("FIRST", "LAST"), help="both included")
    parser.add_argument("--instrument", default="", metavar="NAME", help="one that the request names")


def run_fade(words: argparse.Namespace) -> Result:
    """Run `fade`."""
    from coldglow.answers import fade

    return fade(words.word, tuple(words.years) if words.years else None, words.instrument)


def add_compare(parser: argparse.ArgumentParser) -> None:
    """Arguments of `compare`."""
    request_word(parser)
    parser.add_argument(
        "--instruments", nargs="+", action="extend", metavar="NAME", help="names or paths; default: all"
    )
    parser.add_argument("--jobs", type=int, default=1, metavar="N", help="work in N processes (default 1)")


def run_compare(words: argparse.Namespace) -> Result:
    """Run `compare`."""
    from coldglow.answers import compare
    from coldglow.answers.common.jobs import processes

    with processes(words.jobs) as executor:
        return compare(words.word, words.instruments, executor)


def add_fetch(parser: argparse.ArgumentParser) -> None:
    """Arguments of `fetch`."""
    target_word(parser)
    add_place(parser)
    parser.add_argument("--from", dest="first", metavar="DATE", help="first instant (UTC, ISO date or time)")
    parser.add_argument("--to", dest="last", metavar="DATE", help="last instant (UTC)")
    parser.add_argument("--step", default="1h", metavar="DT", help="step (bare number: minutes; default 1h)")


def run_fetch(words: argparse.Namespace) -> Result:
    """Run `fetch`, which writes its file itself, in the form that a target's `body` takes."""
    from coldglow.answers import fetch

    *others, path = words.write or [None]
    words.write = others
    return fetch(words.word, words.instrument, words.site, words.first, words.last, words.step, path)


def add_plan(parser: argparse.ArgumentParser) -> None:
    """Arguments of `plan`."""
    request_word(parser)
    parser.add_argument("--out", required=True, metavar="DIR", help="folder to write")
    parser.add_argument("--force", action="store_true", help="move an existing folder aside first")
    parser.add_argument(
        "--standards", default="", metavar="FILE", help="your own list of standard stars (CSV); default: ours"
    )


def run_plan(words: argparse.Namespace) -> Result:
    """Run `plan`."""
    from coldglow.answers import plan

    return plan(words.word, words.out, words.force, words.standards, tell=teller("plan"))


def add_check(parser: argparse.ArgumentParser) -> None:
    """Arguments of `check`."""
    parser.add_argument("word", nargs="+", metavar="FILE", help="descriptions to read")


def run_check(words: argparse.Namespace) -> Result:
    """Run `check`."""
    from coldglow.answers import check

    return check(words.word)


def add_show(parser: argparse.ArgumentParser) -> None:
    """Arguments of `show`."""
    parser.add_argument(
        "word", nargs="*", metavar="NAME", help="targets, instruments, or the name of one; empty: both lists"
    )


def run_show(words: argparse.Namespace) -> Result:
    """Run `show`."""
    from coldglow.answers import show

    return show(words.word or "")


def add_draft(parser: argparse.ArgumentParser) -> None:
    """Arguments of `draft`."""
    parser.add_argument("--target", required=True, metavar="NAME")
    parser.add_argument("--instrument", required=True, metavar="NAME")


def run_draft(words: argparse.Namespace) -> str:
    """Run `draft`."""
    from coldglow.answers import draft

    return draft(words.target, words.instrument)


def add_completion(parser: argparse.ArgumentParser) -> None:
    """Arguments of `completion`."""
    parser.add_argument("word", nargs="*", metavar="SHELL", help=" or ".join(SHELLS))


def run_completion(words: argparse.Namespace) -> str:
    """Run `completion`."""
    from coldglow.describe.find import names
    from coldglow.errors import NotFoundError

    if words.word not in SHELLS:
        raise NotFoundError(
            f"no completion for the shell `{words.word}`; there is one for {', '.join(SHELLS)}"
        )
    targets, instruments = names("target"), names("instrument")
    known = {"target": targets, "instrument": instruments, "shell": list(SHELLS)}
    known["show"] = ["targets", "instruments", *targets, *instruments]
    return completion_script(words.word, [syntax_of(name) for name in COMMANDS], known)


def syntax_of(name: str) -> Syntax:
    """Return what a shell must know of a command, read off its parser."""
    options: list[Option] = []
    word: Kind = "file"
    for action in build_parser(name)._actions:  # argparse offers no public way to list them
        metavar = action.metavar if isinstance(action.metavar, str) else ""
        kind = KINDS_OF_WORDS.get(metavar, "text")
        if not action.option_strings:
            word = "show" if name == "show" else kind
            continue
        long = action.option_strings[-1]
        kind = KINDS_OF_OPTIONS.get(long, "flag" if action.nargs == 0 else kind)
        options.append(Option(long, kind, action.nargs in ("+", "*"), action.help or ""))
    return Syntax(name, COMMANDS[name].question, word, tuple(options))


KINDS_OF_WORDS: dict[str, Kind] = {
    "TARGET": "target",
    "SHELL": "shell",
    "FILE": "file",
    "REQUEST.yaml": "file",
}
KINDS_OF_OPTIONS: dict[str, Kind] = {
    "--instrument": "instrument",
    "--instruments": "instrument",
    "--target": "target",
    "--out": "file",
}

COMMANDS: dict[str, Command] = {
    "plan": Command(
        "Everything for one proposal, as a report",
        "coldglow plan examples/uranus-season.yaml --out uranus-plan",
        "REQUEST.yaml",
        add_plan,
        run_plan,
    ),
    "glow": Command(
        "How bright is it, line by line?",
        "coldglow glow uranus --temperature 500K --band 3.4um 4.1um",
        "TARGET",
        add_glow,
        run_glow,
    ),
    "sky": Command(
        "Where is it, which longitude faces us, how fast does it recede?",
        "coldglow sky uranus --site -70.4deg -24.6deg 2600m --from 2027-11-20 --to 2027-11-21 --step 1h",
        "TARGET",
        add_sky,
        run_sky,
    ),
    "expose": Command(
        "How long must I integrate, and what limits me?",
        "coldglow expose examples/uranus-season.yaml --at 2027-11-25T05:00",
        "REQUEST.yaml",
        add_expose,
        run_expose,
    ),
    "hours": Command(
        "Which hours of which nights are best?",
        "coldglow hours examples/uranus-season.yaml --write hours.ecsv",
        "REQUEST.yaml",
        add_hours,
        run_hours,
    ),
    "cover": Command(
        "Which hours together cover a full rotation?",
        "coldglow cover examples/uranus-season.yaml",
        "REQUEST.yaml",
        request_word,
        run_cover,
    ),
    "nights": Command(
        "How many nights must I request?",
        "coldglow nights examples/uranus-season.yaml",
        "REQUEST.yaml",
        request_word,
        run_nights,
    ),
    "fade": Command(
        "Is a colder planet still detectable, and until when?",
        "coldglow fade examples/uranus-season.yaml --years 2027 2047",
        "REQUEST.yaml",
        add_fade,
        run_fade,
    ),
    "compare": Command(
        "Which instrument does it best?",
        "coldglow compare examples/uranus-season.yaml --instruments echelle-8m ifu-8m --jobs 2",
        "REQUEST.yaml",
        add_compare,
        run_compare,
    ),
    "fetch": Command(
        "Get an online ephemeris into a file",
        "coldglow fetch uranus --instrument echelle-8m --from 2027-09-01 --to 2028-03-02 --write uranus.ecsv",
        "TARGET",
        add_fetch,
        run_fetch,
    ),
    "draft": Command(
        "Start a request of my own",
        "coldglow draft --target uranus --instrument echelle-4m > my.yaml",
        "",
        add_draft,
        run_draft,
    ),
    "check": Command(
        "Is my file right, and what did you understand?",
        "coldglow check my.yaml",
        "",
        add_check,
        run_check,
    ),
    "show": Command(
        "What ships with it?",
        "coldglow show uranus --write uranus.json",
        "",
        add_show,
        run_show,
    ),
    "completion": Command(
        "Let my shell complete commands and names",
        "coldglow completion bash",
        "SHELL",
        add_completion,
        run_completion,
    ),
}


def overview() -> str:
    """Return the text of `coldglow --help`."""
    width = max(map(len, COMMANDS))
    lines = [f"  {name:<{width}}  {command.question}" for name, command in COMMANDS.items()]
    return "\n".join(
        [
            "usage: coldglow COMMAND ...",
            "",
            "Can a giant planet's infrared H3+ glow be detected: when, for how long, in how many nights?",
            "",
            *lines,
            "",
            "`coldglow COMMAND --help` explains one of them with an example; `coldglow --version` tells the",
            "version. Exit status: 0 done, 1 not feasible (with --strict), 2 wrong input, 70 internal error,",
            "130 interrupted.",
        ]
    )


def build_parser(name: str) -> Parser:
    """Return the parser of one command."""
    command = COMMANDS[name]
    parser = Parser(
        prog=f"coldglow {name}",
        description=command.question,
        epilog=f"example:\n  {command.example}",
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    command.add(parser)
    if name not in ("draft", "completion"):
        parser.add_argument(
            "--write",
            action="append",
            default=[],
            metavar="FILE",
            help="also write the answer, format by extension: .ecsv .csv .json .tex",
        )
        parser.add_argument("--strict", action="store_true", help="exit status 1 when the answer is no")
    return parser


def parse(arguments: Sequence[str]) -> tuple[Command, argparse.Namespace]:
    """Parse the words after `coldglow`.

    A word such as ``-70.4deg`` is a value, not an option (a leading blank tells argparse so), and an option
    that takes a list gives its last word back when the command's own word is missing, so that
    ``--at T1 T2 TARGET`` works.
    """
    name, *rest = arguments
    parser = build_parser(name)
    command = COMMANDS[name]
    shielded = [f" {word}" if re.match(r"-\.?\d", word) else word for word in rest]
    words = parser.parse_intermixed_args(shielded)
    for key, value in vars(words).items():
        if isinstance(value, list):
            setattr(words, key, [item.strip() if isinstance(item, str) else item for item in value])
        elif isinstance(value, str):
            setattr(words, key, value.strip())
    if command.word:
        found = words.word
        if not found:
            yaml = next((word for word in rest if word.endswith(".yaml")), "")
            for value in vars(words).values():
                if isinstance(value, list) and len(value) > 1 and str(value[-1]) in (rest[-1], yaml):
                    found = [value.pop()]
        if len(found) != 1:
            parser.error(f"give one {command.word}" + (f", not {len(found)}" if found else ""))
        words.word = found[0]
    elif name == "show":
        if len(words.word) > 1:
            parser.error("give one name at most")
        words.word = words.word[0] if words.word else ""
    return command, words


def run(arguments: Sequence[str]) -> int:
    """Run one command and print its answer; return the exit status."""
    command, words = parse(arguments)
    name = arguments[0]
    with nullcontext() if name in TELL_THEMSELVES else waiting(name):
        answer = command.run(words)
    if isinstance(answer, str):
        sys.stdout.write(answer)
        return DONE
    for path in words.write:
        answer.write(path)
    print(answer, flush=True)
    return NOT_FEASIBLE if words.strict and not answer.feasible else DONE


def main(arguments: Sequence[str] | None = None) -> int:
    """Entry point of the `coldglow` command; returns the exit status."""
    words = list(sys.argv[1:] if arguments is None else arguments)
    allow_any_encoding(sys.stdout, sys.stderr)
    if not words or words[0] in ("-h", "--help", "help"):
        print(overview())
        return DONE if words else WRONG_INPUT
    if words[0] == "--version":
        from coldglow import __version__

        print(f"coldglow {__version__}")
        return DONE
    if words[0] not in COMMANDS:
        from difflib import get_close_matches

        near = get_close_matches(words[0], COMMANDS, 1)
        hint = f"; did you mean `{near[0]}`?" if near else ""
        print(f"coldglow: no command `{words[0]}`{hint} (`coldglow --help` lists them)", file=sys.stderr)
        return WRONG_INPUT
    try:
        return run(words)
    except ColdglowError as error:
        print(error, file=sys.stderr)
        return WRONG_INPUT
    except SystemExit as stop:
        return int(stop.code or 0)
    except KeyboardInterrupt:
        print("interrupted; nothing was left half-written", file=sys.stderr)
        return INTERRUPTED
    except BrokenPipeError:
        sys.stderr.close()
        return DONE
    except OSError as error:
        print(f"coldglow: {error.strerror or error}; the answer could not be written", file=sys.stderr)
        return WRONG_INPUT
    except Exception as error:
        import traceback

        traceback.print_exc()
        print(
            f"coldglow: internal error ({type(error).__name__}). This is a fault of the program, not of your "
            "input: please report it with the command and the lines above.",
            file=sys.stderr,
        )
        return INTERNAL


if __name__ == "__main__":
    sys.exit(main())
