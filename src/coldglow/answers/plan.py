"""`plan`: everything for one proposal, as a folder with a report."""

from __future__ import annotations

import os
from pathlib import Path

from coldglow.answers.common.inputs import NamePath, as_request, described, place_errors
from coldglow.answers.common.scenes import Also
from coldglow.answers.planning.findings import Tell, find_out
from coldglow.describe.records import Request
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
    >>> Path("jupiter-plan/figures/light-curve.svg").is_file()
    True

    """
    # what draws is loaded for a report only, so that the other commands start sooner
    from coldglow.answers.planning.reporting import papers_of, report_of
    from coldglow.report.folder import check_free, report_files, write_folder

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
