"""Findings to files: ECSV and JSON (both read back), CSV and TeX, all in full precision.

astropy is imported only where a QTable or ECSV is wanted.
"""

from __future__ import annotations

import csv
import io
import json
import math
import os
import tempfile
import warnings
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from coldglow.errors import OutputError
from coldglow.report import tex
from coldglow.report.tables import Column, Entry, Findings

if TYPE_CHECKING:
    from astropy.table import QTable

FORMAT = "coldglow-result/1"
_KINDS = {"f": "float", "i": "integer", "u": "integer", "b": "boolean", "U": "text"}


def write_result(result: Findings, path: Path, table: str = "") -> Path:
    """Write a result to a file; see `Result.write`."""
    writers: dict[str, Callable[[Findings, str], str]] = {
        ".ecsv": ecsv_text,
        ".csv": csv_text,
        ".json": lambda whole, _: json_text(whole),
        ".tex": tex_text,
    }
    if path.suffix not in writers:
        raise OutputError(
            f"Cannot write {str(path)!r}: the extension {path.suffix!r} is unknown; "
            f"use one of {', '.join(writers)}."
        )
    write_text(path, writers[path.suffix](result, table))
    return path


def write_text(path: Path, text: str) -> None:
    """Write a text file whole or not at all.

    Raises:
        OutputError: The folder is missing or the place cannot be written.

    """
    try:
        handle, name = tempfile.mkstemp(prefix=f".{path.name}.", dir=path.parent)
    except OSError as error:
        raise OutputError(f"Cannot write {str(path)!r}: {error.strerror or error}.") from error
    try:
        with os.fdopen(handle, "w", encoding="utf-8", newline="\n") as stream:
            stream.write(text)
        umask = os.umask(0)
        os.umask(umask)
        os.chmod(name, 0o666 & ~umask)
        os.replace(name, path)
    except BaseException as error:
        os.unlink(name)
        if isinstance(error, OSError):
            raise OutputError(f"Cannot write {str(path)!r}: {error.strerror or error}.") from error
        raise


# ---------------------------------------------------------------- JSON


def json_text(result: Findings) -> str:
    """Return the whole result as JSON; a missing number is null, infinity the text ``infinity``."""
    content = {
        "format": FORMAT,
        **_summary(result),
        "tables": {
            name: {
                "caption": table.caption,
                "columns": {column.name: _column_record(column) for column in table.columns},
            }
            for name, table in result.tables.items()
        },
    }
    return json.dumps(_strict(content), ensure_ascii=False, allow_nan=False, indent=1) + "\n"


def _summary(result: Findings) -> dict[str, Any]:
    return {
        "command": result.command,
        "feasible": result.feasible,
        "sentences": list(result.sentences),
        "warnings": list(result.warnings),
        "header": {key: _entry_record(entry) for key, entry in result.header.items()},
    }


def _entry_record(entry: Entry) -> dict[str, Any]:
    record: dict[str, Any] = {"value": _native(entry.value), "unit": entry.unit, "text": str(entry)}
    if entry.random_error is not None:
        record["random_error"] = float(entry.random_error)
    if entry.systematic_error is not None:
        record["systematic_error"] = float(entry.systematic_error)
    if entry.label:
        record["label"] = entry.label
    return record


def _column_record(column: Column) -> dict[str, Any]:
    return {
        "unit": column.unit,
        "type": _KINDS[column.values.dtype.kind],
        "description": column.description,
        "values": column.values.tolist(),
    }


def _native(value: Any) -> Any:
    return value.item() if isinstance(value, np.generic) else value


def _strict(value: Any) -> Any:
    """Replace the numbers that JSON does not know."""
    if isinstance(value, dict):
        return {key: _strict(part) for key, part in value.items()}
    if isinstance(value, list):
        return [_strict(part) for part in value]
    if isinstance(value, float) and not math.isfinite(value):
        return None if math.isnan(value) else "infinity" if value > 0 else "-infinity"
    return value


def to_qtable(result: Findings, name: str = "") -> QTable:
    """Return one table as an astropy QTable; texts stay texts, flags booleans."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # where no home can be written it says so, which is no matter here
        from astropy import units
        from astropy.table import Column as PlainColumn
        from astropy.table import QTable

    table = result.table(name)
    quantities = QTable()
    for column in table.columns:
        if column.unit:
            quantities[column.name] = units.Quantity(column.values, units.Unit(column.unit))
        else:
            quantities[column.name] = PlainColumn(column.values)
        quantities[column.name].info.description = column.description or None
    spelled = {column.name: column.unit for column in table.columns if column.unit}
    about = {"table": name or result.main, "caption": table.caption, "units": spelled}
    quantities.meta = {"coldglow": {**_summary(result), **about}}
    return quantities


def ecsv_text(result: Findings, name: str = "") -> str:
    """Return one table as ECSV with units, descriptions, and the header in its metadata."""
    stream = io.StringIO()
    to_qtable(result, name).write(stream, format="ascii.ecsv")
    return stream.getvalue()


def csv_text(result: Findings, name: str = "") -> str:
    """Return one table as comma-separated values (RFC 4180): names, then values, nothing else."""
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    columns = result.table(name).columns
    writer.writerow(column.name for column in columns)
    writer.writerows(zip(*(column.values.tolist() for column in columns), strict=True))
    return stream.getvalue()


def tex_text(result: Findings, name: str = "") -> str:
    r"""Return one table as a TeX ``tabular`` to be read by ``\input``; the header stands in comments."""
    columns = result.table(name).columns
    comments = [f"% {key}: {entry}".replace("\n", " ") for key, entry in result.header.items()]
    return (
        "\n".join([*comments, tex.tabular(columns, lambda column, row: _tex_cell(column.values[row]))]) + "\n"
    )


def _tex_cell(value: Any) -> str:
    value = _native(value)
    if isinstance(value, bool):
        return "yes" if value else "no"
    return tex.number(repr(value)) if isinstance(value, int | float) else tex.escape(value)
