"""What a report owes its readers beside the answer: inputs, assumptions, sources, cautions, versions."""

from __future__ import annotations

from collections.abc import Iterator
from importlib.metadata import version

import numpy as np

from coldglow import __version__
from coldglow.answers.common.scenes import conditions_words
from coldglow.answers.fading.words import law_words
from coldglow.answers.planning.findings import Findings
from coldglow.describe.records import Instrument, Request, Site, Target
from coldglow.describe.resolved import assumed
from coldglow.describe.summary import summary
from coldglow.report import words
from coldglow.report.record import Assumption
from coldglow.scenario import Scenario, emission_of

NEAR_SUN_RAD = np.radians(60.0)
HIGH_M = 2500.0
LIBRARIES = ("numpy", "scipy", "pyerfa", "jplephem", "skyfield-data", "matplotlib")
METHODS = (
    "Line list and levels of H3+: computed for this program by a variational calculation on the potential "
    "of Polyansky et al. 2000, Mol. Phys. 98, 261, with the dipole surface of Roehse et al. 1994, J. Chem. "
    "Phys. 101, 2231; positions good to 0.005 cm-1 (class A) to 1 cm-1 (class D), Einstein A to 2-3 % for "
    "strong lines.",
    "Earth's transmission: derived from published spectra for two site heights, good to 0.03 in 2.05-2.35 "
    "and 3.45-4.05 micron and to 0.05-0.1 elsewhere; method and notices travel with the package (NOTICE.md).",
    "Ephemeris: JPL DE421 unless the request names another; kernels hold planet-system barycentres, up to "
    "320 km and 2.3 m/s from the planet's centre.",
    "Poles, meridians and radii: Archinal et al. 2018, Celest. Mech. Dyn. Astron. 130, 22; airmass: Young "
    "1994, Appl. Opt. 33, 1108.",
    "Information and errors: Fisher matrix, nuisances marginalised by the Schur complement, Tegmark et al. "
    "1997, ApJ 480, 22.",
)


def inputs_of(request: Request) -> dict[str, str]:
    """Return what was understood of the request, label to words."""
    return dict(summary(request))


def assumptions_of(found: Findings, standards: str = "") -> list[Assumption]:
    """Return everything that was taken for granted: what the program decides, then what nobody wrote."""
    request = found.request
    listed = list(_decided(found, standards))
    records: list[Request | Target | Instrument] = [request, request.target]
    records += [use.instrument for use in request.uses]
    seen = set()
    for record in records:
        kind = type(record).__name__.lower()
        for key, value in assumed(record):
            what = f"{kind}{'' if record is request else f' {record.name}'}, {_spoken(key)}"
            if what not in seen:
                seen.add(what)
                listed.append(Assumption(what, value, f"default of the {kind} format (`{key}`)"))
    return listed


def _spoken(key: str) -> str:
    """Return a key path in words: ``weather.clear_fraction`` becomes ``weather: clear fraction``."""
    return ": ".join(part.replace("_", " ") for part in key.split("."))


def _decided(found: Findings, standards: str) -> Iterator[Assumption]:
    request, target = found.request, found.request.target
    emission, cooling = emission_of(request), target.cooling
    state = words.with_error(emission.temperature_k.value, emission.temperature_k.uncertainty, "K")
    column = words.with_error(emission.column_m2.value, emission.column_m2.uncertainty, "m-2")
    yield Assumption(
        "state of the ionosphere",
        f"{state}, vertical column {column} (given as {emission.given_as}), in the middle of the nights: the "
        f"{words.quantity(target.emission.temperature_k.value, 'K')} of {words.day(cooling.epoch)} by the "
        f"cooling law ({cooling.law})",
        f"target {target.name}, block `emission`",
    )
    yield Assumption(
        "populations of the levels",
        "local equilibrium at one temperature, with the upper levels holding "
        f"{words.percent(emission.lte_fraction.value)} of it",
        f"target {target.name}, block `emission`: `lte_fraction` (published columns assume equilibrium)",
    )
    if found.fading is not None:
        law = law_words(target.emission, cooling)
        yield Assumption("cooling", law, f"target {target.name}, block `cooling`")
    for scene in found.scenes:
        use = scene.use
        yield Assumption(
            f"night assumed at {use.instrument.name}",
            conditions_words(use, scene.air),
            f"request, `conditions`: {request.conditions.name} quartile of the site, or as stated",
        )
    rotation = {system.name: system for system in target.rotation.systems}
    default = request.longitudes == target.rotation.systems[0].name
    system = rotation[request.longitudes]
    yield Assumption(
        "longitudes",
        f"system {system.name}, period {words.number(system.period_s / 3600.0, 8)} h, growing {system.grows}",
        f"the target's default: {target.rotation.reason}"
        if default and target.rotation.reason
        else "request",
    )
    yield Assumption(
        "ephemeris", request.ephemeris or "JPL DE421, packaged", "request" if request.ephemeris else "default"
    )
    for each in found.exposed:
        moment = each.result.header["moment"]
        yield Assumption(
            f"moment of the exposure figures, {each.seen.use.instrument.name}",
            str(moment),
            "chosen by the program",
        )
    yield Assumption("list of standard stars", standards or "packaged list", "option `standards`")
    yield Assumption("random numbers", f"seed {request.weather.seed}", "request, `weather.seed`")


def sources_of(request: Request) -> list[str]:
    """Return the sources of the target's and the instruments' numbers, and of the methods."""
    target = request.target
    blocks = ("rotation", "figure", "emission", "continuum", "cooling")
    listed = [f"{target.name}, {block}: {getattr(target, block).source}" for block in blocks]
    for use in request.uses:
        instrument = use.instrument
        listed += [
            f"{instrument.name}, {block}: {source}"
            for block, source in (
                ("sky", instrument.sky.source),
                ("telescope", instrument.telescope.source),
                (f"setting {use.setting.name}", use.setting.source),
                ("detector", instrument.detector.source),
                ("operation", instrument.operation.source),
            )
            if source
        ]
    return [*dict.fromkeys(listed), *METHODS]


def cautions_of(scenes: tuple[Scenario, ...]) -> list[str]:
    """Return what could hurt people or telescopes, and what lies outside the validity of the numbers."""
    found = list(_dangers(scenes))
    found += sorted({warning for scene in scenes for warning in scene.warnings})
    found.append(
        "This is a forecast. The observatory's own rules, limits and safety instructions come first; what is "
        "planned here gives no permission to point a telescope anywhere."
    )
    return found


def _dangers(scenes: tuple[Scenario, ...]) -> Iterator[str]:
    told: set[str] = set()
    for scene in scenes:
        name, place, limits = (
            scene.use.instrument.name,
            scene.use.instrument.place,
            scene.use.instrument.limits,
        )
        if not scene.usable.any() or name in told:
            continue
        told.add(name)
        nearest = float(np.degrees(scene.track.solar_elongation_rad[scene.usable].min()))
        if nearest < np.degrees(NEAR_SUN_RAD) or limits.daytime:
            yield (
                f"{name}: the target comes as near as {words.number(nearest, 2)}° to the Sun in the hours "
                "listed. Sunlight in a large telescope destroys instruments and blinds people: observe only "
                "with the observatory's Sun avoidance in force and its staff's consent."
            )
        if isinstance(place, Site) and place.height_m >= HIGH_M:
            yield (
                f"{name}: the site lies at {words.number(place.height_m)} m. Work at that height needs "
                "acclimatisation and the medical rules of the observatory, and never alone."
            )


def versions_of() -> dict[str, str]:
    """Return the versions that the numbers depend on."""
    return {"coldglow": __version__, **{name: version(name) for name in LIBRARIES}}
