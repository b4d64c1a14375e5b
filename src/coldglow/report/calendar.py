"""The chosen stretches as a calendar file (RFC 5545): events and words in, text out.

Times are UTC. Nothing depends on when or where the file is written: the stamp is handed in and an event's
identifier is made from its contents, so the same plan gives the same bytes.
"""

from __future__ import annotations

import hashlib
import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime

LINE_OCTETS = 75  # RFC 5545, section 3.1


@dataclass(frozen=True, slots=True)
class Event:
    """One stretch: ISO times in UTC, a title, and the lines of its description."""

    start_utc: str
    end_utc: str
    title: str
    description: tuple[str, ...] = ()
    place: str = ""


@dataclass(frozen=True, slots=True)
class StretchFacts:
    """What an observer wants to read in an event; angles in degrees, rates in arcsec per hour.

    In space the airmasses are nan.
    """

    airmass_start: float
    airmass_end: float
    airmass_min: float
    longitude_start_deg: float
    longitude_end_deg: float
    longitude_system: str
    integration_s: float
    coadds: int
    setting: str
    ra_rate_arcsec_h: float  # times cos dec
    dec_rate_arcsec_h: float
    standards_before: tuple[str, ...] = ()
    standards_after: tuple[str, ...] = ()


def describe_stretch(facts: StretchFacts) -> tuple[str, ...]:
    """Return the lines of an event's description."""
    lines = []
    if math.isfinite(facts.airmass_min):
        lines.append(
            f"Airmass {facts.airmass_start:.2f} at the start, {facts.airmass_end:.2f} at the end, "
            f"least {facts.airmass_min:.2f}"
        )
    lines += [
        f"Central longitude {facts.longitude_start_deg:.0f} to {facts.longitude_end_deg:.0f} deg "
        f"(system {facts.longitude_system})",
        f"Set-up: {facts.setting}, integrations of {facts.integration_s:.4g} s, {facts.coadds} co-added",
        f"Non-sidereal rates: RA x cos(Dec) {facts.ra_rate_arcsec_h:+.2f} arcsec/h, "
        f"Dec {facts.dec_rate_arcsec_h:+.2f} arcsec/h",
    ]
    if facts.standards_before:
        lines.append("Standard stars before: " + ", ".join(facts.standards_before))
    if facts.standards_after:
        lines.append("Standard stars after: " + ", ".join(facts.standards_after))
    return tuple(lines)


def calendar_text(events: Iterable[Event], name: str, stamp_utc: str, version: str = "") -> str:
    """Return the text of a calendar file; write it with ``newline=""``, its lines end in CR LF already.

    `name` is shown as the calendar's name; `stamp_utc` is the ISO time that stands as the time of making
    (DTSTAMP). An event needs start < end.

    Raises: ValueError for an event that ends before it starts.
    Source: RFC 5545, sections 3.1 (folding), 3.3.11 (text), 3.4, 3.6.1 and 3.8.7.2 (DTSTAMP); the name by
    RFC 7986, section 5.1.
    """
    stamp = _utc(stamp_utc)
    program = f"coldglow {version}".strip()
    lines = [
        "BEGIN:VCALENDAR",
        "VERSION:2.0",
        f"PRODID:-//coldglow//{_text(program)}//EN",
        "CALSCALE:GREGORIAN",
        f"NAME:{_text(name)}",
    ]
    repeats: dict[str, int] = {}
    for event in events:
        identity = _identity(event)
        repeats[identity] = repeats.get(identity, -1) + 1
        tail = f"-{repeats[identity]}" if repeats[identity] else ""
        lines += _event_lines(event, stamp, f"{identity}{tail}@coldglow")
    lines.append("END:VCALENDAR")
    return "".join(f"{folded}\r\n" for line in lines for folded in _fold(line))


def _event_lines(event: Event, stamp: str, identity: str) -> Sequence[str]:
    start, end = _utc(event.start_utc), _utc(event.end_utc)
    if end <= start:
        raise ValueError(f"The event {event.title!r} ends at {event.end_utc}, not after {event.start_utc}.")
    return [
        "BEGIN:VEVENT",
        f"UID:{identity}",
        f"DTSTAMP:{stamp}",
        f"DTSTART:{start}",
        f"DTEND:{end}",
        f"SUMMARY:{_text(event.title)}",
        *([f"DESCRIPTION:{_text(chr(10).join(event.description))}"] if event.description else []),
        *([f"LOCATION:{_text(event.place)}"] if event.place else []),
        "TRANSP:OPAQUE",
        "END:VEVENT",
    ]


def _identity(event: Event) -> str:
    """Return an identifier that only the stretch decides: the same plan updates, not doubles, its events."""
    key = "\n".join((_utc(event.start_utc), _utc(event.end_utc), event.title, event.place))
    return hashlib.sha256(key.encode()).hexdigest()[:32]


def _utc(iso: str) -> str:
    """Return an ISO time, UTC unless it carries an offset, as ``20310405T060708Z``."""
    moment = datetime.fromisoformat(iso)
    moment = moment.replace(tzinfo=UTC) if moment.tzinfo is None else moment.astimezone(UTC)
    return moment.strftime("%Y%m%dT%H%M%SZ")


def _text(value: str) -> str:
    """Escape a text value; control characters other than line ends, which RFC 5545 forbids, are left out."""
    lines = value.replace("\r\n", "\n").replace("\r", "\n")
    kept = "".join(c for c in lines if c in "\n\t" or (ord(c) >= 32 and ord(c) != 127))
    return kept.replace("\\", "\\\\").replace(";", "\\;").replace(",", "\\,").replace("\n", "\\n")


def _fold(line: str) -> list[str]:
    """Cut a line into pieces of at most 75 octets, not inside a character; later ones start with a space."""
    pieces, piece, octets = [], "", 0
    for character in line:
        size = len(character.encode())
        if octets + size > LINE_OCTETS:
            pieces.append(piece)
            piece, octets = " ", 1
        piece += character
        octets += size
    return [*pieces, piece]
