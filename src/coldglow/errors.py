"""What can go wrong, one exception per distinct mistake.

Exit status of the command line: 2 for everything here, 130 interrupted, 70 for any other exception.
"""

from __future__ import annotations

from dataclasses import dataclass


class ColdglowError(Exception):
    """Base of every error that the user can mend; shown without a traceback."""


@dataclass(frozen=True, slots=True)
class Problem:
    """One mistake in one description: where it stands, what is wrong, what would be accepted."""

    file: str
    line: int
    key: str
    what: str
    accepted: str = ""

    def __str__(self) -> str:
        """Return ``FILE:LINE: key.path: what is wrong; what is accepted``."""
        tail = f"; {self.accepted}" if self.accepted else ""
        key = f"{self.key}: " if self.key else ""
        return f"{self.file}:{self.line}: {key}{self.what}{tail}"


class DescriptionError(ColdglowError, ValueError):
    """A description that cannot be used; carries every problem found in it, not only the first."""

    def __init__(self, problems: list[Problem]) -> None:
        """Keep the problems as an attribute and join them, one a line, as the message."""
        self.problems = list(problems)
        super().__init__("\n".join(str(problem) for problem in self.problems))


class NotFoundError(ColdglowError, LookupError):
    """A target, instrument, setting, line or file that does not exist; the sentence names the nearest one.

    ``key`` as in `RangeError`.
    """

    def __init__(self, message: str, key: str = "") -> None:
        """Keep the key path beside the sentence."""
        self.key = key
        super().__init__(message)


class UnitError(ColdglowError, ValueError):
    """A quantity on the command line or in a call without its unit, or with one of the wrong kind."""


class RangeError(ColdglowError, ValueError):
    """A value outside what the physics or the data behind it can answer.

    Raised below ``describe/``. ``key`` is the key path in the description that holds the value, so that
    the border can say in which file and line it stands; empty when the value came from no description.
    """

    def __init__(self, message: str, key: str = "") -> None:
        """Keep the key path beside the sentence."""
        self.key = key
        super().__init__(message)


class DateError(RangeError):
    """A date outside the span of the ephemeris."""


class SaturationError(RangeError):
    """A setting that fills the detector's well within its shortest integration."""

    def __init__(self, message: str, longest_safe_s: float, key: str = "") -> None:
        """Keep the longest safe integration in seconds."""
        self.longest_safe_s = longest_safe_s
        super().__init__(message, key)


class OutputError(ColdglowError, OSError):
    """An output file or folder that cannot be written, or that exists already."""


class ServiceError(ColdglowError, ConnectionError):
    """The online ephemeris service could not be reached or did not understand the question."""
