"""The report's folder: written whole or not at all, never over another one."""

from __future__ import annotations

import os
import shutil
import tempfile
from collections.abc import Mapping
from pathlib import Path

from coldglow.errors import OutputError
from coldglow.report.figures import look
from coldglow.report.files import ecsv_text
from coldglow.report.page import render_page
from coldglow.report.record import Report

Files = Mapping[str, str | bytes]


def report_files(report: Report) -> dict[str, str | bytes]:
    """Return the page, the figures (SVG and PDF) and the tables (ECSV) by path within the folder."""
    drawings = {picture.name: look.as_svg(picture.figure) for picture in report.pictures()}
    contents: dict[str, str | bytes] = {"report.html": render_page(report, drawings)}
    for picture in report.pictures():
        contents[f"figures/{picture.name}.svg"] = drawings[picture.name]
        contents[f"figures/{picture.name}.pdf"] = look.as_pdf(picture.figure)
    result = report.as_result("plan")
    for name in result.tables:
        contents[f"tables/{name}.ecsv"] = ecsv_text(result, name)
    return contents


def check_free(path: Path, force: bool = False) -> None:
    """Refuse a place that is taken, before any long computation.

    Raises: OutputError when something stands there and `force` is not given, or when it is the working
    folder or one above it.
    """
    where = path.resolve()
    if not os.path.lexists(where):
        return
    if not force:
        raise OutputError(
            f"{str(path)!r} exists already; name another folder, or give --force to move it aside."
        )
    if Path.cwd().is_relative_to(where):
        raise OutputError(f"{str(path)!r} holds the folder you work in; name another folder.")


def write_folder(path: Path, contents: Files, force: bool = False) -> Path:
    """Write files (path within the folder -> text or bytes) into a new folder and return its path.

    Everything goes into a hidden folder beside it, which takes its name at the end. With `force` a folder
    that stands there is renamed first, to the first free of ``NAME.1``, ``NAME.2``, ...

    Raises: OutputError as `check_free`, and when the place cannot be written.
    """
    check_free(path, force)
    where = path.resolve()
    try:
        where.parent.mkdir(parents=True, exist_ok=True)
        draft = Path(tempfile.mkdtemp(prefix=f".{where.name}.", dir=where.parent))
    except OSError as error:
        raise OutputError(f"Cannot write {str(path)!r}: {error.strerror or error}.") from error
    try:
        _fill(draft, contents)
        _take_place(draft, where, force)
    except OSError as error:
        raise OutputError(f"Cannot write {str(path)!r}: {error.strerror or error}.") from error
    finally:
        shutil.rmtree(draft, ignore_errors=True)
    return path


def _fill(folder: Path, contents: Files) -> None:
    umask = os.umask(0)
    os.umask(umask)
    folder.chmod(0o777 & ~umask)
    for name, content in contents.items():
        file = folder / name
        file.parent.mkdir(parents=True, exist_ok=True)
        file.write_bytes(content if isinstance(content, bytes) else content.encode("utf-8"))


def _take_place(draft: Path, where: Path, force: bool) -> None:
    """Give the finished folder its name; what stood there is put back if that fails."""
    if not (force and os.path.lexists(where)):
        draft.rename(where)
        return
    number = 1
    while os.path.lexists(aside := where.with_name(f"{where.name}.{number}")):
        number += 1
    where.rename(aside)
    try:
        draft.rename(where)
    except BaseException:
        aside.rename(where)
        raise
