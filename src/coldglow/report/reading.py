"""Results back from the ECSV and JSON files that `files` writes."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from coldglow.errors import OutputError
from coldglow.report.files import FORMAT
from coldglow.report.results import Column, Entry, Result, Table

_DTYPES = {"float": np.float64, "integer": np.int64, "boolean": np.bool_, "text": np.str_}


def read_result(path: str | Path) -> Result:
    """Read a result that was written as .json (everything) or .ecsv (one table).

    Raises:
        OutputError: The file is missing, has another extension, or was not written by Coldglow.

    >>> import coldglow
    >>> written = coldglow.glow("uranus", band=("3.9 um", "4.0 um")).write("glow.ecsv")
    >>> read_result(written).header["target"].value
    'Uranus'

    """
    path = Path(path)
    readers = {".json": _read_json, ".ecsv": _read_ecsv}
    if path.suffix not in readers:
        raise OutputError(f"Cannot read {str(path)!r} back: only .json and .ecsv keep units and header.")
    try:
        return readers[path.suffix](path)
    except OSError as error:
        raise OutputError(f"Cannot read {str(path)!r}: {error.strerror or error}.") from error
    except (KeyError, ValueError, TypeError) as error:
        raise OutputError(f"{str(path)!r} is not a result written by Coldglow: {error}.") from error


def _read_json(path: Path) -> Result:
    content = json.loads(path.read_text(encoding="utf-8"))
    if content["format"] != FORMAT:
        raise ValueError(f"its format is {content['format']!r}, expected {FORMAT!r}")
    tables = {
        name: Table(
            tuple(_read_column(key, record) for key, record in table["columns"].items()), table["caption"]
        )
        for name, table in content["tables"].items()
    }
    return _with_summary(content, tables)


def _read_column(name: str, record: dict[str, Any]) -> Column:
    kind = record["type"]
    values = [_loose(value) for value in record["values"]] if kind == "float" else record["values"]
    return Column(name, np.array(values, _DTYPES[kind]), record["unit"], description=record["description"])


def _read_ecsv(path: Path) -> Result:
    from astropy.table import Table as PlainTable

    content = PlainTable.read(path, format="ascii.ecsv")
    summary = content.meta["coldglow"]
    columns = tuple(
        Column(
            name,
            _plain_values(content[name]),
            summary["units"].get(name, ""),
            description=content[name].description or "",
        )
        for name in content.colnames
    )
    return _with_summary(summary, {summary["table"]: Table(columns, summary["caption"])})


def _plain_values(column: Any) -> NDArray[Any]:
    """Return the values of an astropy column; an empty text is read as masked and means the empty text."""
    return np.asarray(column.filled("") if hasattr(column, "filled") else column)


def _with_summary(content: dict[str, Any], tables: dict[str, Table]) -> Result:
    header = {key: _read_entry(record) for key, record in content["header"].items()}
    return Result(
        content["command"], tables, header, content["sentences"], content["warnings"], content["feasible"]
    )


def _read_entry(record: dict[str, Any]) -> Entry:
    value = record["value"]
    if value is None or value in ("infinity", "-infinity"):
        value = _loose(value)
    random, systematic = (
        _loose(record[key]) if key in record else None for key in ("random_error", "systematic_error")
    )
    return Entry(value, record["unit"], record["text"], random, systematic, label=record.get("label", ""))


def _loose(value: Any) -> float:
    return math.nan if value is None else float(value)
