"""What `plan` writes: the report with its chapters, and the papers beside it."""

from __future__ import annotations

from collections.abc import Iterator

from coldglow.answers.planning.chapters.comparison import comparison_chapter, worth_comparing
from coldglow.answers.planning.chapters.exposure import exposure_chapter
from coldglow.answers.planning.chapters.nights import nights_chapter
from coldglow.answers.planning.chapters.outlook import outlook_chapter
from coldglow.answers.planning.chapters.season import season_chapter
from coldglow.answers.planning.chapters.turn import turn_chapter
from coldglow.answers.planning.findings import Findings
from coldglow.answers.planning.headline import answer, merit, verdict
from coldglow.answers.planning.justification import justification_of
from coldglow.answers.planning.paperwork import (
    assumptions_of,
    cautions_of,
    inputs_of,
    sources_of,
    versions_of,
)
from coldglow.answers.planning.telescope import calendar_of, pages_of
from coldglow.describe.resolved import resolved_text
from coldglow.report.proposal import bibliography, justification_markdown, justification_tex
from coldglow.report.record import Report, Section


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
