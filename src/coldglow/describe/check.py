"""A tree against its schema: the typed block, or every mistake as a problem with file and line."""

from __future__ import annotations

import difflib
from collections.abc import Iterator
from typing import Any, TypeVar, get_args

from pydantic import ValidationError

from coldglow.describe.fields import Block, Refusals, Refused
from coldglow.describe.reader import Tree
from coldglow.errors import Problem
from coldglow.units import quoted

SomeBlock = TypeVar("SomeBlock", bound=Block)


def check_tree(
    schema: type[SomeBlock], tree: Tree, prefix: str = ""
) -> tuple[SomeBlock | None, list[Problem]]:
    """Return the typed description (None when there are mistakes) and the mistakes.

    `prefix` is put before the key paths of the problems, for a description inside another one.
    """
    try:
        return schema.model_validate(tree.data), []
    except ValidationError as error:
        problems = []
        for detail in error.errors(include_url=False):
            path = tuple(part for part in detail["loc"] if part != "[key]")
            for refused in _explain(schema, path, detail):
                key = ".".join([*map(str, path), *([refused.key] if refused.key else [])])
                file, line = tree.locate(key)
                problems.append(Problem(file, line, prefix + key, refused.what, refused.accepted))
        return None, problems


def _explain(schema: type[Block], path: tuple[Any, ...], detail: Any) -> Iterator[Refused]:
    """Yield one of pydantic's details as sentences of ours."""
    kind = detail["type"]
    cause = detail.get("ctx", {}).get("error")
    if isinstance(cause, Refusals):
        yield from cause.all
    elif isinstance(cause, Refused):
        yield cause
    elif kind == "extra_forbidden":
        known = list(_block_at(schema, path[:-1]).model_fields)
        near = difflib.get_close_matches(str(path[-1])[:60], known, n=1)
        accepted = f"did you mean `{near[0]}`?" if near else f"one of {', '.join(known)}"
        yield Refused("this key is not known here", accepted)
    elif kind == "missing" and isinstance(path[-1], int):
        yield Refused(
            f"entry {path[-1] + 1} of this list is missing", "as many entries as shown in the examples"
        )
    elif kind == "missing":
        yield Refused("this key is missing", "add it")
    elif kind == "literal_error":
        yield _not_one_of(detail)
    elif kind == "too_long":
        yield Refused("this list is too long", f"{detail['ctx']['max_length']} entries")
    elif kind in ("model_type", "model_attributes_type", "dict_type"):
        yield Refused("a block of `key: value` lines belongs here", "indented lines below the key")
    else:
        assert kind == "tuple_type", kind  # nothing else can come of a tree of texts
        yield Refused("a list belongs here", "e.g. `[3.9 um, 4.1 um]`")


def _not_one_of(detail: Any) -> Refused:
    allowed = detail["ctx"]["expected"].replace(" or ", ", ").replace("'", "").split(", ")
    word = str(detail["input"])
    near = difflib.get_close_matches(word[:60], allowed, n=1)
    hint = f", did you mean `{near[0]}`?" if near else ""
    return Refused(f"{quoted(word)} is not known here{hint}", "one of " + ", ".join(allowed))


def _block_at(schema: type[Block], path: tuple[Any, ...]) -> type[Block]:
    """Return the schema of the block at a key path; an index or the name of an entry changes nothing."""
    block = schema
    for part in path:
        if part in block.model_fields:
            block = _block_in(block.model_fields[part].annotation) or block
    return block


def _block_in(annotation: Any) -> type[Block] | None:
    if isinstance(annotation, type) and issubclass(annotation, Block):
        return annotation
    for argument in get_args(annotation):
        if (found := _block_in(argument)) is not None:
            return found
    return None
