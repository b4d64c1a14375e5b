"""Numbers that say when they stop being true: a sentence in the answer and in the report, or an error."""

import pytest

from coldglow.answers import glow, hours, plan, sky
from coldglow.answers.fade import fade
from coldglow.errors import ColdglowError, DateError, NotFoundError, RangeError

WARM = "emission:\n  temperature: {value: 1600 K, uncertainty: 10 K, scatter: 0 K}\n"
COLD = "emission:\n  temperature: {value: 120 K, uncertainty: 5 K, scatter: 0 K}\ncooling:\n  floor: 60 K\n"
THICK = "emission:\n  column: {value: 1e19 m-2, uncertainty: 10 %, scatter: 0 %}\n"
STARVED = "emission:\n  lte_fraction: 0.3\n"
TARGETS = {
    "too cold": (COLD, "below 150 K"),
    "too warm": (WARM, "above 1500 K"),
    "the total": (WARM, "do not use the total"),
    "optically thick": (THICK, "not optically thin"),
    "out of equilibrium": (STARVED, "Out of equilibrium"),
}


@pytest.mark.parametrize("name", TARGETS)
def test_a_state_beyond_the_line_list_or_thin_gas_is_said(name, write, variant):
    body, said = TARGETS[name]
    target = variant("target", "uranus", body)
    request = write(("target: uranus              #", f"target: {target} #"))
    for answer in (glow(target), hours(request)):
        assert any(said in warning for warning in answer.warnings), name
        assert said.split()[0] in str(answer)
    usual = [*glow("uranus").warnings, *hours(write(name="usual.yaml")).warnings]
    assert not any(said in warning for warning in usual)


def test_the_artificial_column_warns_where_the_depth_passes_a_tenth(variant):
    """The depth is linear in the column: between the columns of depth 0.09 and 0.11 the sentence appears."""
    import numpy as np

    from coldglow.light.emission import optical_depth
    from coldglow.light.lines import lines_in

    deepest = float(np.max(optical_depth(lines_in(1.9e-6, 5.5e-6), 500.0, 1e16)))
    for depth, warned in ((0.09, False), (0.11, True)):
        column = 1e16 * depth / deepest
        answer = glow("uranus", temperature=500.0, column_density=column)
        assert any("not optically thin" in warning for warning in answer.warnings) is warned


AIR = {
    "water": (
        ("  name: median              # good", "  water: 20 mm\n  name: median # good"),
        "20 mm is beyond it",
    ),
    "airmass": (("  airmass_max: 1.8", "  airmass_max: 6\n  altitude_min: 3 deg"), "checked up to airmass 3"),
}


@pytest.mark.parametrize("name", AIR)
def test_air_beyond_the_table_is_said(name, write):
    change, said = AIR[name]
    assert any(said in warning for warning in hours(write(change)).warnings)
    assert not any(said in warning for warning in hours(write(name="usual.yaml")).warnings)


@pytest.mark.parametrize("height", ["0 m", "7000 m"])
def test_a_site_beyond_the_table_of_air_is_an_error_with_its_line(height, write, variant):
    machine = variant("instrument", "echelle-8m", f"name: elsewhere\nsite:\n  height: {height}\n")
    request = write(("- instrument: echelle-8m ", f"- instrument: {machine} "))
    with pytest.raises(RangeError, match="height") as refused:
        hours(request)
    assert "instrument.yaml:5: site.height: " in str(refused.value)


def test_dates_beyond_the_kernel_are_an_error(write):
    with pytest.raises(DateError, match="DE421"):
        hours(write(nights=("2060-01-01", "2060-01-02")))
    with pytest.raises(ColdglowError):
        sky("uranus", site=(0.0, 0.0, 0.0), at=["1890-01-01"])


def test_dates_beyond_the_rotation_elements_are_an_error(write):
    """Elements are given about J2000 (Archinal et al. 2018): no date outside 1900-2150 is accepted at all."""
    for nights in (("1850-01-01", "1850-01-02"), ("2200-01-01", "2200-01-02")):
        with pytest.raises(ColdglowError):
            hours(write(nights=nights, extra="\nephemeris: builtin\n"))


def test_a_longitude_that_nobody_knows_is_said():
    answer = sky("uranus", site=(0.0, 0.0, 0.0), at=["2027-11-25T05:00"], longitudes="iau2015")
    assert "unknown: the rotation period leaves" in " ".join(answer.sentences)
    known = sky("uranus", site=(0.0, 0.0, 0.0), at=["2027-11-25T05:00"])
    assert "is known to" in " ".join(known.sentences)


def test_an_outlook_into_the_cold_says_where_the_list_ends(write, variant):
    cold = variant(
        "target",
        "uranus",
        "emission:\n  temperature: {value: 140 K, uncertainty: 1 K}\ncooling:\n  floor: 60 K\n",
    )
    request = write(
        ("target: uranus              #", f"target: {cold} #"), ("last_year: 2047", "last_year: 2028")
    )
    with pytest.raises(RangeError, match=r"cooling\.rate: .*the line list holds from 150 K"):
        fade(request)


def test_the_report_carries_the_warnings_too(write, variant, tmp_path):
    body = "emission:\n  temperature: {value: 260 K, uncertainty: 1 K, scatter: 0 K}\n  lte_fraction: 0.3\n"
    target = variant(
        "target", "uranus", body + "  column: {value: 1e19 m-2, uncertainty: 10 %, scatter: 0 %}\n"
    )
    request = write(
        ("target: uranus              #", f"target: {target} #"),
        ("  airmass_max: 1.8", "  airmass_max: 6\n  altitude_min: 3 deg"),
        ("  name: median              # good", "  water: 20 mm\n  name: median # good"),
        ("last_year: 2047", "last_year: 2028"),
        nights=("2027-11-20", "2027-11-20"),
    )
    plan(request, out=tmp_path / "out")
    page = (tmp_path / "out" / "report.html").read_text(encoding="utf-8")
    for said in (
        "not optically thin",
        "Out of equilibrium",
        "20 mm is beyond it",
        "airmass 3",
    ):
        assert said in page, said


def test_a_line_that_the_setting_lacks_is_told_with_its_place(write):
    path = write(("goal:\n", "goal:\n  lines: ['Q(9,99)']\n"))
    line = path.read_text(encoding="utf-8").split("lines:")[0].count("\n") + 1
    with pytest.raises(NotFoundError, match="nearest") as refused:
        hours(path)
    assert str(refused.value).startswith(f"{path}:{line}: goal.lines: ")
