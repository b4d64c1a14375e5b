"""A file and all that it extends, put together into one tree; the format line and its policy.

``extends: NAME`` starts from another description of the same kind. Blocks are merged key by key, lists
are replaced as a whole, an empty value drops what was inherited. Every value keeps the file and line that
wrote it.

Policy of versions: the number after the slash grows only when a file of the older version would be
understood differently. Older versions stay readable; a later one is refused with a sentence, because
guessing what a newer file means would give a wrong plan.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path
from typing import Literal

from coldglow.describe.find import find
from coldglow.describe.reader import Node, Tree, read_tree
from coldglow.errors import DescriptionError, NotFoundError, Problem
from coldglow.units import quoted

DescriptionKind = Literal["target", "instrument", "request"]
KINDS: tuple[DescriptionKind, ...] = ("target", "instrument", "request")
VERSION = 1
LONGEST_CHAIN = 10


def kind_of(tree: Tree) -> DescriptionKind:
    """Return the kind that the format line names. Raises `DescriptionError` when it names none."""
    wanted = ", ".join(f"`format: coldglow-{kind}/{VERSION}`" for kind in KINDS)
    written = tree.data.get("format")
    if written is None:
        raise DescriptionError([Problem(tree.file, 1, "format", "this key is missing", f"one of {wanted}")])
    parts = re.fullmatch(r"coldglow-(\w+)/(\d{1,6})", written.strip()) if isinstance(written, str) else None
    kind = next((kind for kind in KINDS if parts and parts[1] == kind), None)
    if parts is None or kind is None:
        shown = quoted(written) if isinstance(written, str) else "this"
        raise DescriptionError([tree.problem("format", f"{shown} is not a known format", f"one of {wanted}")])
    if int(parts[2]) != VERSION:
        what = (
            f"this file is written in version {parts[2]} of the format, this program reads version {VERSION}"
        )
        raise DescriptionError([tree.problem("format", what, "install a later coldglow, or an older file")])
    return kind


def assemble(path: Path, kind: DescriptionKind) -> Tree:
    """Return the merged tree of a file of that kind, without its `format` and `extends` lines.

    Raises `NotFoundError` when the file cannot be read, `DescriptionError` with every mistake of form.
    """
    return merge_bases(read_tree(path), kind, path)


def merge_bases(tree: Tree, kind: DescriptionKind, path: Path, inside: bool = False) -> Tree:
    """Return a tree merged with all that it extends; `inside` another one it needs no format line."""
    chain = [path.resolve()]
    merged: Tree | None = None
    while True:
        if not inside or "format" in tree.data:
            check_kind(tree, kind)
        inside = False
        merged = tree if merged is None else overlay(tree, merged)
        merged.data.pop("format", None)
        name = merged.data.pop("extends", None)
        if name is None:
            return merged
        tree, path = _base(merged, name, kind, path, chain)


def check_kind(tree: Tree, kind: DescriptionKind) -> None:
    """Raise `DescriptionError` when the format line names another kind."""
    found, article = (
        kind_of(tree),
        {"target": "a target", "instrument": "an instrument", "request": "a request"},
    )
    if found != kind:
        raise DescriptionError(
            [tree.problem("format", f"this file describes {article[found]}", f"{article[kind]} here")]
        )


def _base(tree: Tree, name: Node, kind: DescriptionKind, path: Path, chain: list[Path]) -> tuple[Tree, Path]:
    if kind == "request" or not isinstance(name, str) or not name.strip():
        what = "a request extends nothing" if kind == "request" else "this is not a name"
        raise DescriptionError([tree.problem("extends", what, "the name or path of a target or instrument")])
    try:
        base_path = find(name.strip(), kind, beside=path)
    except NotFoundError as error:
        raise DescriptionError([tree.problem("extends", str(error))]) from None
    if base_path.resolve() in chain or len(chain) == LONGEST_CHAIN:
        names = " -> ".join(link.name for link in [*chain, base_path.resolve()])
        raise DescriptionError(
            [tree.problem("extends", f"this goes round in a circle: {names}", "remove it")]
        )
    chain.append(base_path.resolve())
    return read_tree(base_path), base_path


def overlay(base: Tree, top: Tree) -> Tree:
    """Return `base` with everything that `top` writes laid over it."""
    replaced: set[str] = set()
    data = _overlay(base.data, top.data, "", replaced)
    lines = {key: where for key, where in base.lines.items() if replaced.isdisjoint(_enclosing(key))}
    return Tree(top.file, data, lines | top.lines)


def _overlay(base: dict[str, Node], top: dict[str, Node], path: str, replaced: set[str]) -> dict[str, Node]:
    merged = dict(base)
    for key, node in top.items():
        below = base.get(key)
        if isinstance(node, dict) and isinstance(below, dict):
            merged[key] = _overlay(below, node, f"{path}{key}.", replaced)
            continue
        replaced.add(path + key)
        if below is not None and isinstance(node, str) and node.strip() in ("", "~", "null"):
            del merged[key]
        else:
            merged[key] = node
    return merged


def _enclosing(key: str) -> Iterator[str]:
    """Yield a key path and all that enclose it."""
    while key:
        yield key
        key = key.rpartition(".")[0]
