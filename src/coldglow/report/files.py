"""Results in files: ECSV and JSON (both read back), CSV and TeX, all in full precision.

astropy is imported only where a QTable or ECSV is wanted.
"""

from __future__ import annotations

import csv
import io
import json
import math
import os
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from coldglow.errors import OutputError
from coldglow.report import tex
from coldglow.report.results import Column, Entry, Result, Table

if TYPE_CHECKING:
    from astropy.table import QTable

FORMAT = "coldglow-result/1"
_KINDS = {"f": "float", "i": "integer", "u": "integer", "b": "boolean", "U": "text"}
_DTYPES = {"float": np.float64, "integer": np.int64, "boolean": np.bool_, "text": np.str_}


def write_result(result: Result, path: Path, table: str = "") -> Path:
    """Write a result to a file; see `Result.write`."""
    writers: dict[str, Callable[[Result, str], str]] = {
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

    Raises
    ------
    OutputError
        The folder is missing or the place cannot be written.

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


def json_text(result: Result) -> str:
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


def _summary(result: Result) -> dict[str, Any]:
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


def _loose(value: Any) -> float:
    return math.nan if value is None else float(value)


# ---------------------------------------------------------------- ECSV, CSV, TeX


def to_qtable(result: Result, name: str = "") -> QTable:
    """Return one table as an astropy QTable; texts stay texts, flags booleans."""
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


def ecsv_text(result: Result, name: str = "") -> str:
    """Return one table as ECSV with units, descriptions, and the header in its metadata."""
    stream = io.StringIO()
    to_qtable(result, name).write(stream, format="ascii.ecsv")
    return stream.getvalue()


def csv_text(result: Result, name: str = "") -> str:
    """Return one table as comma-separated values (RFC 4180): names, then values, nothing else."""
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    columns = result.table(name).columns
    writer.writerow(column.name for column in columns)
    writer.writerows(zip(*(column.values.tolist() for column in columns), strict=True))
    return stream.getvalue()


def tex_text(result: Result, name: str = "") -> str:
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


# ---------------------------------------------------------------- reading back


def read_result(path: str | Path) -> Result:
    """Read a result that was written as .json (everything) or .ecsv (one table).

    Raises
    ------
    OutputError
        The file is missing, has another extension, or was not written by Coldglow.

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
