"""`plan`: everything for one proposal, as a folder with a report."""

from __future__ import annotations

import os
from collections.abc import Iterator
from pathlib import Path

from coldglow.answers.chapters.comparison import comparison_chapter, worth_comparing
from coldglow.answers.chapters.exposure import exposure_chapter
from coldglow.answers.chapters.nights import nights_chapter
from coldglow.answers.chapters.outlook import outlook_chapter
from coldglow.answers.chapters.season import season_chapter
from coldglow.answers.chapters.turn import turn_chapter
from coldglow.answers.findings import Findings, Tell, find_out
from coldglow.answers.headline import answer, merit, verdict
from coldglow.answers.inputs import NamePath, as_request, described, place_errors
from coldglow.answers.justification import justification_of
from coldglow.answers.paperwork import assumptions_of, cautions_of, inputs_of, sources_of, versions_of
from coldglow.answers.scenes import Also
from coldglow.answers.telescope import calendar_of, pages_of
from coldglow.describe.records import Request
from coldglow.describe.resolved import resolved_text
from coldglow.report.folder import check_free, report_files, write_folder
from coldglow.report.proposal import bibliography, justification_markdown, justification_tex
from coldglow.report.record import Report, Section
from coldglow.report.results import Entry, Result, column, table
from coldglow.sky.stars import load_standards


def plan(
    request: NamePath | Request,
    out: str | os.PathLike[str],
    force: bool = False,
    standards: str = "",
    also: Also = None,
    tell: Tell = lambda step: None,
) -> Result:
    """Answer everything the request asks and write it into a folder.

    The folder holds ``report.html``, ``nights.html`` (a sheet for each night), ``observing.ics``,
    ``justification.tex`` and ``.md`` with ``references.bib``, ``request.yaml`` as resolved, and the figures
    and tables one by one. The same request gives the same bytes.

    Args:
        request: path or record.
        out: folder to be made; nothing half-written is left when the run is interrupted.
        force: move an existing folder aside first.
        standards: path of a list of standard stars; default: the packaged one.
        also: a further constraint, as in `hours`.
        tell: called with a few words at the beginning of each step.

    Returns:
        The headline numbers and the names of the files, as a result.

    Raises:
        OutputError: the folder exists, or cannot be written.

    >>> result = plan("examples/jupiter-ovals.yaml", out="jupiter-plan")
    >>> result.sentences[0]
    'Feasible: ask for 2 h in 2 nights.'
    >>> sorted(path.name for path in Path("jupiter-plan").iterdir())[:4]
    ['figures', 'justification.md', 'justification.tex', 'nights.html']

    """
    record, place = as_request(request), Path(out)
    check_free(place, force)
    stars = load_standards(standards)
    with place_errors(*described(record)):
        found = find_out(record, stars, tell, also)
        tell("figures")
        report = report_of(found, standards)
        contents = report_files(report) | papers_of(found, report)
    tell("writing")
    write_folder(place, contents, force)
    return Result(
        "plan",
        {"files": table(column("file", sorted(contents)), caption=f"Written to {place}", rows=())},
        {"page": Entry(str(place / "report.html")), **report.figures_of_merit},
        [f"{report.verdict}.", *report.answer],
        report.cautions,
        report.feasible,
    )


def report_of(found: Findings, standards: str = "") -> Report:
    """Return the report on what was found."""
    request = found.request
    return Report(
        title=request.name,
        verdict=verdict(found),
        feasible=found.feasible,
        answer=answer(found),
        figures_of_merit=merit(found),
        sections=list(_chapters(found)),
        inputs=inputs_of(request),
        assumptions=assumptions_of(found, standards),
        sources=sources_of(request),
        cautions=cautions_of(found.scenes),
        versions=versions_of(),
        seed=request.weather.seed,
    )


def _chapters(found: Findings) -> Iterator[Section]:
    for i, each in enumerate(found.exposed):
        yield exposure_chapter(each, f"-{i + 1}" if i else "")
    if found.visible and worth_comparing(found.comparison):
        yield comparison_chapter(found.comparison)
    why = "the stretches to ask for" if "nights" in found.nights.header else "the best within the budget"
    yield season_chapter(found.scenes, found.hours, found.stretches, why)
    if found.cover is not None:
        yield turn_chapter(found.choice, found.cover)
    yield nights_chapter(found.request, found.nights)
    if found.fading is not None and found.fade is not None:
        yield outlook_chapter(found.fading, found.fade)


def papers_of(found: Findings, report: Report) -> dict[str, str]:
    """Return the files beside the page: for the proposal, for the telescope, and the request as resolved."""
    text = justification_of(found)
    pairs = list(zip(found.stretches, found.standards, strict=True))
    versions = ", ".join(f"{name} {number}" for name, number in report.versions.items())
    return {
        "justification.tex": justification_tex(text),
        "justification.md": justification_markdown(text),
        "references.bib": bibliography(text.cited()),
        "observing.ics": calendar_of(found.request, pairs),
        "nights.html": pages_of(found.request, pairs),
        "request.yaml": f"# resolved by {versions}\n# seed {report.seed}\n{resolved_text(found.request)}",
    }
