"""What a request says against the target and the instruments that it names."""

from __future__ import annotations

import difflib
from collections.abc import Iterable

from coldglow.describe.reader import Tree
from coldglow.describe.records import Instrument, Setting, Target
from coldglow.describe.request_schema import RequestSchema, UseBlock
from coldglow.errors import Problem
from coldglow.units import quoted


def target_mistakes(request: RequestSchema, target: Target, tree: Tree) -> list[Problem]:
    """Return the names in a request that its target does not know."""
    problems = []
    systems = [system.name for system in target.rotation.systems]
    if request.longitudes is not None and request.longitudes not in systems:
        problems.append(_unknown(tree, "longitudes", "longitude system", request.longitudes, systems))
    spots = [spot.name for spot in target.emission.spots]
    wanted = request.coverage.spot
    if wanted is not None and wanted not in spots:
        problems.append(_unknown(tree, "coverage.spot", "spot of this target", wanted, spots))
    return problems


def chosen_setting(
    use: UseBlock, instrument: Instrument, key: str, tree: Tree
) -> tuple[Setting, list[Problem]]:
    """Return the setting that a request asks for (the instrument's first if it names none)."""
    settings = {setting.name: setting for setting in instrument.settings}
    first = instrument.settings[0]
    if use.setting is None or use.setting in settings:
        return settings.get(use.setting or "", first), []
    kind = f"setting of {instrument.name}"
    return first, [_unknown(tree, f"{key}.setting", kind, use.setting, settings)]


def _unknown(tree: Tree, key: str, kind: str, name: str, known: Iterable[str]) -> Problem:
    all_known = list(known)
    near = difflib.get_close_matches(name[:60], all_known, n=1)
    accepted = f"one of {', '.join(all_known)}" if all_known else "it has none"
    if near:
        accepted = f"did you mean `{near[0]}`? ({accepted})"
    return tree.problem(key, f"there is no {kind} named {quoted(name)}", accepted)
