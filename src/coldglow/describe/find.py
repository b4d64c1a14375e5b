"""Where descriptions lie: a path, the working folder, the folders of COLDGLOW_PATH, then what ships.

A name such as ``uranus`` stands for ``uranus.yaml`` of the right kind: a file in the working folder counts
only when its ``format:`` line says that it is a target (or an instrument), so that a request named like a
planet does not hide the planet.
"""

from __future__ import annotations

import difflib
import os
import re
from collections.abc import Iterator
from importlib.resources import files
from pathlib import Path
from typing import Literal

from coldglow.errors import NotFoundError
from coldglow.units import quoted

NamedKind = Literal["target", "instrument"]

_FORMAT = re.compile(rb"^\s*format\s*:\s*[\"']?coldglow-(\w+)/", re.MULTILINE)


def shipped_folder(kind: NamedKind) -> Path:
    """Return the folder of shipped descriptions: package data, or the checkout of an editable install."""
    inside = Path(str(files("coldglow"))) / "data" / f"{kind}s"
    if inside.is_dir():
        return inside
    return Path(__file__).resolve().parents[3] / f"{kind}s"


def search_folders(kind: NamedKind) -> Iterator[Path]:
    """Yield the folders in the order in which they are searched."""
    yield Path()
    for entry in os.environ.get("COLDGLOW_PATH", "").split(os.pathsep):
        if entry:
            yield Path(entry)
            yield Path(entry) / f"{kind}s"
    yield shipped_folder(kind)


def is_path(name_or_path: str | os.PathLike[str]) -> bool:
    """Return whether this is meant as a path: a `Path`, or a text with a separator or a suffix."""
    if not isinstance(name_or_path, str):
        return True
    return "/" in name_or_path or os.sep in name_or_path or name_or_path.endswith((".yaml", ".yml"))


def find(name_or_path: str | os.PathLike[str], kind: NamedKind, beside: Path | None = None) -> Path:
    """Return the file of a target or instrument.

    `beside` is the file that asks: relative paths start at its folder, its folder is searched first, and
    it never finds itself, so that a file named like the one it extends works.

    Raises `NotFoundError`, naming the nearest name.
    """
    text = os.fspath(name_or_path)
    if is_path(name_or_path):
        path = Path(text).expanduser()
        if beside is not None and not path.is_absolute():
            path = beside.parent / path
        if is_file(path):
            return path
        raise NotFoundError(f"there is no {kind} file {quoted(text)}")
    folders = [*([beside.parent] if beside is not None else []), *search_folders(kind)]
    if re.fullmatch(r"[^\x00-\x1f]{1,100}", text):
        for folder in folders:
            for path in (folder / f"{text}.yaml", folder / f"{text.lower()}.yaml"):
                if is_file(path) and _kind_of(path) == kind and not _same(path, beside):
                    return path
    known = names(kind)
    near = difflib.get_close_matches(text.lower()[:60], known, n=1, cutoff=0.5)
    hint = f"; did you mean `{near[0]}`?" if near else f"; there are {', '.join(known)}"
    raise NotFoundError(f"there is no {kind} named {quoted(text)}{hint}")


def names(kind: NamedKind) -> list[str]:
    """Return the names of all targets or instruments that a name would find, sorted."""
    found = set()
    for folder in search_folders(kind):
        found |= {path.stem for path in folder.glob("*.yaml") if _kind_of(path) == kind}
    return sorted(found)


def is_file(path: Path) -> bool:
    """Return whether this is a file; a name that no file can have is none."""
    try:
        return path.is_file()
    except OSError:  # a name too long, a folder closed to us
        return False


def _same(path: Path, other: Path | None) -> bool:
    return other is not None and path.resolve() == other.resolve()


def _kind_of(path: Path) -> str:
    """Return what the format line of a file says, empty when there is none."""
    try:
        with path.open("rb") as file:
            match = _FORMAT.search(file.read(8192))
    except OSError:
        return ""
    return match.group(1).decode() if match else ""
