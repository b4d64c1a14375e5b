"""From a name or a path to a finished record: the public door of this layer.

    target = load_target("uranus")
    request = load_request("mine.yaml")

Every mistake of a file, of what it extends and of what it names is reported at once.
"""

from __future__ import annotations

import os
from collections.abc import Iterator
from pathlib import Path

from coldglow.describe.assemble import assemble, kind_of, merge_bases, overlay
from coldglow.describe.check import check_tree
from coldglow.describe.find import find, is_file, is_path, names
from coldglow.describe.instrument_schema import InstrumentSchema
from coldglow.describe.reader import Node, Tree, capped, read_tree
from coldglow.describe.records import Instrument, Origin, Request, Target, Use
from coldglow.describe.request_rules import chosen_setting, target_mistakes
from coldglow.describe.request_schema import RequestSchema
from coldglow.describe.target_schema import TargetSchema
from coldglow.errors import DescriptionError, NotFoundError, Problem
from coldglow.units import quoted

__all__ = ["load_any", "load_instrument", "load_instrument_for", "load_request", "load_target", "names"]

NamePath = str | os.PathLike[str]


def load_target(name_or_path: NamePath) -> Target:
    """Return the target of that name or file.

    Raises `NotFoundError` (with the nearest name) or `DescriptionError` (with every mistake).

    >>> target = load_target("uranus")
    >>> target.emission.temperature_k.value
    430.0
    """
    return _target(assemble(find(name_or_path, "target"), "target"))


def load_instrument(name_or_path: NamePath) -> Instrument:
    """Return the instrument of that name or file.

    Raises `NotFoundError` (with the nearest name) or `DescriptionError` (with every mistake).

    >>> [setting.name for setting in load_instrument("echelle-8m").settings]
    ['q-branch', 'r-branch', 'overtone']
    """
    return _instrument(assemble(find(name_or_path, "instrument"), "instrument"))


def load_request(path: NamePath) -> Request:
    """Return the request of that file, its target and instruments loaded.

    Raises `NotFoundError` when there is no such file, `DescriptionError` with every mistake in it, in its
    target and in its instruments.

    >>> request = load_request("examples/uranus-season.yaml")
    >>> request.target.name, request.uses[0].setting.name
    ('Uranus', 'q-branch')
    """
    file = Path(path).expanduser()
    return _request(assemble(file, "request"), file)


def load_instrument_for(request: Request, name_or_path: NamePath) -> Instrument:
    """Return another instrument as the request would see it: with the request's own limits laid over.

    Limits that mean nothing for it (an airmass in space) leave its own as they are.

    Raises `NotFoundError` (with the nearest name) or `DescriptionError` (with every mistake).
    """
    file = Path(request.origin.file)
    if not request.origin.file or not file.is_file():
        return load_instrument(name_or_path)
    path = find(name_or_path, "instrument", beside=file)
    try:
        return _requested_instrument(assemble(file, "request"), file, "instruments", str(path))
    except DescriptionError:
        return load_instrument(path)


def load_any(name_or_path: NamePath) -> Target | Instrument | Request:
    """Return whatever the file describes, by its format line; a name is looked up among what is known.

    Raises `NotFoundError` or `DescriptionError`.
    """
    path = Path(name_or_path).expanduser()
    if not is_path(name_or_path) and not path.is_file():
        is_instrument = os.fspath(name_or_path) in names("instrument")
        return load_instrument(name_or_path) if is_instrument else load_target(name_or_path)
    found = kind_of(read_tree(path))
    if found == "request":
        return load_request(path)
    return load_target(path) if found == "target" else load_instrument(path)


def _raise_if(problems: list[Problem]) -> None:
    if problems:
        raise DescriptionError(capped(problems))


def _origin(tree: Tree) -> Origin:
    return Origin(tree.file, dict(tree.lines))


def _settle_path(tree: Tree, key: str, suffix: str, accepted: str, prefix: str = "") -> list[Problem]:
    """Turn a path that stands in a description into one seen from here; it must be a file.

    Relative paths start at the folder of the file that wrote them. Words without the suffix stay.
    """
    written = tree.data.get(key)
    if not isinstance(written, str) or not written.strip().endswith(suffix):
        return []
    file, line = tree.locate(key)
    path = Path(file).parent / Path(written.strip()).expanduser()
    tree.data[key] = str(path)
    if is_file(path):
        return []
    return [Problem(file, line, prefix + key, f"there is no file {quoted(str(path))}", accepted)]


def _target(tree: Tree, prefix: str = "") -> Target:
    missing = _settle_path(tree, "body", ".ecsv", "a stored table of the ephemeris service", prefix)
    schema, problems = check_tree(TargetSchema, tree, prefix)
    _raise_if(problems + missing)
    assert schema is not None
    return schema.record(_origin(tree))


def _instrument(tree: Tree, prefix: str = "") -> Instrument:
    missing = _settle_path(tree, "atmosphere", "", "a table of transmission", prefix)
    schema, problems = check_tree(InstrumentSchema, tree, prefix)
    _raise_if(problems + missing)
    assert schema is not None
    return schema.record(_origin(tree))


def _request(tree: Tree, file: Path) -> Request:
    problems = []
    if tree.data.get("ephemeris") != "builtin":
        problems += _settle_path(tree, "ephemeris", "", "`builtin` or an SPK kernel")
    schema, mistakes = check_tree(RequestSchema, tree)
    problems += mistakes
    target: Target | None = None
    try:
        target = _requested_target(tree, file)
    except DescriptionError as error:
        problems += error.problems
    instruments: dict[int, Instrument] = {}
    for index, key, node in _requested_instruments(tree):
        try:
            instruments[index] = _requested_instrument(tree, file, key, node)
        except DescriptionError as error:
            problems += error.problems
    uses: list[Use] = []
    if schema is not None:
        problems += target_mistakes(schema, target, tree) if target else []
        for index, instrument in instruments.items():
            setting, mistakes = chosen_setting(
                schema.instruments[index], instrument, f"instruments.{index}", tree
            )
            problems += mistakes
            uses.append(Use(instrument, setting, schema.instruments[index].cost))
    _raise_if(problems)
    assert schema is not None
    assert target is not None
    return schema.record(target, tuple(uses), _origin(tree))


def _requested_target(tree: Tree, file: Path) -> Target | None:
    """Return the target that the request names or describes; None when the key is missing."""
    node = tree.data.get("target")
    if isinstance(node, dict):
        return _target(merge_bases(tree.branch("target"), "target", file, inside=True), "target.")
    if not isinstance(node, str) or not node.strip():
        return None
    try:
        path = find(node.strip(), "target", beside=file)
    except NotFoundError as error:
        raise DescriptionError([tree.problem("target", str(error))]) from None
    return _target(assemble(path, "target"))


def _requested_instruments(tree: Tree) -> Iterator[tuple[int, str, Node]]:
    """Yield position, key path and node of every instrument that is named or described."""
    entries = tree.data.get("instruments", [])
    for index, entry in enumerate(entries if isinstance(entries, list) else [entries]):
        key = f"instruments.{index}" if isinstance(entries, list) else "instruments"
        node = entry.get("instrument") if isinstance(entry, dict) else entry
        if isinstance(node, dict) or (isinstance(node, str) and node.strip()):
            yield index, f"{key}.instrument" if isinstance(entry, dict) else key, node


def _requested_instrument(tree: Tree, file: Path, key: str, node: Node) -> Instrument:
    """Return an instrument that the request names or describes, with the request's own limits."""
    prefix = ""
    if isinstance(node, dict):
        found = merge_bases(tree.branch(key), "instrument", file, inside=True)
        prefix = f"{key}."
    else:
        try:
            found = assemble(find(str(node).strip(), "instrument", beside=file), "instrument")
        except NotFoundError as error:
            raise DescriptionError([tree.problem(key, str(error))]) from None
    limits = tree.data.get("limits")
    if isinstance(limits, dict):
        lines = {path: where for path, where in tree.lines.items() if f"{path}.".startswith("limits.")}
        found = overlay(found, Tree(found.file, {"limits": limits}, lines))
    return _instrument(found, prefix)
