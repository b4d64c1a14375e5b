from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from coldglow.answers.common.moment import look
from coldglow.answers.common.visit import Visit, needs
from coldglow.answers.expose import expose
from coldglow.describe.load import load_instrument, load_request
from coldglow.describe.records import Estimate, Goal, Use
from coldglow.errors import NotFoundError, RangeError
from coldglow.plan.goal import column_error, marginalise, required_snr, temperature_error
from coldglow.scenario import follow, state_of
from coldglow.sky.clock import times_grid

EXAMPLES = Path(__file__).parents[2] / "examples"
WHEN = "2027-11-25T03:00"


def request(**goal):
    found = load_request(EXAMPLES / "uranus-season.yaml")
    asked = {"snr": None, "lines": (), "temperature_error_k": None, "column_error": None, "probability": 0.9}
    return replace(found, goal=Goal(**(asked | (goal or {"snr": 10.0}))))


def with_instrument(asked, name, setting=0, **operation):
    record = load_instrument(name)
    record = replace(record, operation=replace(record.operation, **operation))
    return replace(asked, uses=(Use(record, record.settings[setting]),))


def in_state(asked, temperature_k, column_m2):
    emission = replace(
        asked.target.emission, temperature_k=Estimate(temperature_k), column_m2=Estimate(column_m2)
    )
    still = replace(asked.target.cooling, law="constant", column_rate_s=Estimate(0.0))
    return replace(asked, target=replace(asked.target, emission=emission, cooling=still))


@pytest.fixture(scope="module")
def uranus():
    return expose(request(), at=WHEN)


def test_columns_of_the_main_table(uranus):
    names = [column.name for column in uranus.table().columns]
    wanted = {"clock_time", "shutter_time", "snr", "temperature_error", "column_error"}
    assert wanted | {"coldest_temperature", "smallest_column"} <= set(names)
    table = uranus.table()
    assert table.column("clock_time").unit == table.column("shutter_time").unit == "h"
    assert np.all(table["clock_time"] > table["shutter_time"])
    for name in ("temperature_error", "column_error", "coldest_temperature", "smallest_column"):
        assert np.all(np.diff(table[name]) < 0.0)  # longer is better
    assert np.all(np.diff(table["snr"]) > 0.0)


def test_the_goal_is_reached_at_the_time_that_is_told(uranus):
    asked = request()
    again = expose(asked, at=WHEN, clock=3600.0 * uranus.header["time_to_goal"].value)
    assert again.header["snr"].value == pytest.approx(required_snr(10.0, 0.9), rel=1e-9)
    assert uranus.header["snr"].value == pytest.approx(required_snr(10.0, 0.9), rel=1e-9)


@pytest.mark.parametrize(("key", "wanted"), [("temperature_error", 15.0), ("column_error", 0.2)])
def test_goals_may_be_errors(key, wanted):
    name = {"temperature_error": "temperature_error_k"}.get(key, key)
    asked = request(**{name: wanted})
    found = expose(asked, at=WHEN)
    need = found.header[f"time_to_{key}"]
    again = expose(asked, at=WHEN, clock=3600.0 * need.value)
    assert again.header[key].value == pytest.approx(wanted, rel=1e-9)


def test_precision_below_the_systematic_errors_is_answered_with_that_sentence():
    found = expose(request(temperature_error_k=2.0), at=WHEN)
    fixed = found.header["systematic_temperature"].value
    assert fixed > 2.0
    said = found.sentences[0]
    assert "± 2 K (random)" in said
    assert "the systematic error of ± " in said
    assert "more time lowers it little" in said


def test_systematic_errors_stand_beside_the_random_ones(uranus):
    assert "(random)" in str(uranus.header["temperature_error"])
    assert "(systematic)" in str(uranus.header["temperature_error"])
    assert "(systematic)" in str(uranus.header["column_error"])
    causes = uranus.table("systematics")
    total = np.sqrt(np.sum(np.square(causes["temperature"])))
    assert total == pytest.approx(uranus.header["systematic_temperature"].value, rel=1e-6)


def test_limits_give_the_goal_when_put_back(uranus):
    asked, header = request(), uranus.header
    significance = asked.fade.significance
    clock_s = 3600.0 * header["time_to_goal"].value
    state = state_of(asked)
    colder = in_state(asked, header["coldest_temperature"].value, state.column_m2)
    assert expose(colder, at=WHEN, clock=clock_s).header["snr"].value == pytest.approx(significance, rel=1e-9)
    fewer = in_state(asked, state.temperature_k, header["smallest_column"].value)
    assert expose(fewer, at=WHEN, clock=clock_s).header["snr"].value == pytest.approx(significance, rel=1e-9)


def test_limits_against_time_give_the_goal_nearly(uranus):
    # the table interpolates over 40 temperatures and 56 columns: measured within 1e-4 of the SNR
    asked, table, state = request(), uranus.table(), state_of(request())
    for row in (0, 6, -1):
        clock_s = 3600.0 * float(table["clock_time"][row])
        colder = in_state(asked, float(table["coldest_temperature"][row]), state.column_m2)
        fewer = in_state(asked, state.temperature_k, float(table["smallest_column"][row]))
        for other in (colder, fewer):
            snr = expose(other, at=WHEN, clock=clock_s).header["snr"].value
            assert snr == pytest.approx(asked.fade.significance, rel=1e-4)


def test_kind_and_significance_of_the_limits_are_stated(uranus):
    caption = uranus.table().caption
    assert "vertical column" in caption
    assert f"SNR {request().fade.significance:g}" in caption
    assert "vertical" in str(uranus.header["smallest_column"])
    assert "line of sight" in str(uranus.header["smallest_column"])


def test_the_share_of_the_temperature_information(uranus):
    share = uranus.table("lines")["temperature_share"]
    assert share.sum() == pytest.approx(1.0)
    assert np.all(share >= 0.0)
    # the pair that tells T: without its two best lines the error grows, without the two worst it hardly does
    label, order = uranus.table("lines")["label"], np.argsort(share)
    whole = expose(request(), at=WHEN, clock="1h").header["temperature_error"].value
    best = expose(request(snr=10.0, lines=tuple(label[order[2:]])), at=WHEN, clock="1h")
    worst = expose(request(snr=10.0, lines=tuple(label[order[:-2]])), at=WHEN, clock="1h")
    assert whole <= best.header["temperature_error"].value < 1.1 * whole
    assert worst.header["temperature_error"].value > 2.0 * whole


def test_correlation_and_errors_belong_together(uranus):
    # sigma of ln N with T free against fixed T: a factor 1/sqrt(1 - rho^2), for any two parameters
    header = uranus.header
    floor = request().uses[0].instrument.operation.visit_floor
    fixed = np.sqrt(1.0 / header["snr"].value ** 2 - floor**2)  # the error of ln N at this T, without floors
    expected = fixed / np.sqrt(1.0 - header["correlation"].value ** 2)
    assert header["column_error"].value == pytest.approx(expected, rel=1e-6)
    assert header["correlation"].value < 0.0  # hotter and fewer look alike


def test_one_line_gives_a_column_and_no_temperature():
    asked = request(snr=10.0, lines=("Q(1,0)",))
    found = expose(asked, at=WHEN)
    assert np.all(np.isinf(found.table()["temperature_error"]))
    assert found.feasible
    assert any("give no temperature" in sentence for sentence in found.sentences)
    assert "not measured" in str(found.header["temperature_error"])
    never = expose(request(temperature_error_k=20.0, lines=("Q(1,0)",)), at=WHEN)
    assert not never.feasible
    assert "never" in never.sentences[0]


def test_snr_above_the_floors_is_never():
    found = expose(with_instrument(request(snr=500.0), "echelle-8m", common_floor=0.005), at=WHEN)
    assert not found.feasible
    assert "is never reached: the floors end at SNR" in found.sentences[0]
    assert np.isinf(found.header["time_to_goal"].value)


def test_time_to_report_and_its_mistakes():
    found = expose(request(), at=WHEN, clock="3h")
    assert found.header["shutter_time"].value < 3.0
    assert "in 3 h" in found.sentences[1]
    with pytest.raises(RangeError, match=r"10 min on the clock leave no open shutter.*30 min"):
        expose(request(), at=WHEN, clock="10min")
    with pytest.raises(NotFoundError, match="echelle-8m"):
        expose(request(), at=WHEN, instrument="ifu-8m")


def test_a_prior_on_the_continuum_counts_once_in_a_visit():
    # an imager that measures one band: what it knows beforehand does not grow with the time
    record = load_instrument("narrowband-3m")
    setting = replace(record.settings[0], off_band_m=None, on_band_share=1.0, continuum_prior=0.2)
    asked = replace(request(), uses=(Use(record, setting),))
    seen = look(asked, asked.uses[0], follow(asked, asked.uses[0], times_grid([WHEN])))
    visit = seen.visit
    short, long = (visit.yields(seconds) for seconds in (60.0, 6e6))
    by_hand = marginalise(6e6 * seen.detail.matrix + seen.detail.prior)
    np.testing.assert_allclose(long, by_hand)
    assert long[0, 0] < 1e5 * short[0, 0] * (1.0 - 1e-6)  # less than in proportion to the time
    need = needs(
        Goal(snr=5.0, lines=(), temperature_error_k=None, column_error=None, probability=0.5),
        visit,
        seen.systematic,
    )[0]
    if np.isfinite(need.open_s):
        assert float(visit.snr(need.open_s)) == pytest.approx(5.0, rel=1e-9)


@pytest.mark.parametrize("measure", [temperature_error, column_error])
def test_times_to_errors_with_a_prior(measure):
    rng = np.random.default_rng(8)
    root = rng.standard_normal((4, 4))
    operation = load_instrument("echelle-8m").operation
    visit = Visit(root @ root.T, np.diag([0.0, 0.0, 5.0, 0.0]), 0.8, operation)
    wanted = float(measure(visit.yields(321.0)))
    found = visit.time_to(lambda matrix: measure(matrix) ** -2.0, wanted**-2.0)
    assert found == pytest.approx(321.0, rel=1e-9)


def test_no_visit_is_shorter_than_one_cycle_of_its_exposures():
    imager = expose(EXAMPLES / "jupiter-ovals.yaml", at="2027-03-02T12:00")
    record = load_request(EXAMPLES / "jupiter-ovals.yaml")
    seen = look(record, record.uses[0], follow(record, record.uses[0], times_grid(["2027-03-02T12:00"])))
    plan = seen.detail.plan
    cycle_s = 4.0 * float(plan.coadds[0] * plan.integration_s[0])  # band and off-band, target and sky
    goal = Goal(snr=5.0, lines=(), temperature_error_k=None, column_error=None, probability=0.9)
    need = needs(goal, seen.visit, seen.systematic)[0]
    assert need.open_s == pytest.approx(cycle_s)
    assert f"the shortest visit there is (expected SNR {float(seen.visit.snr(cycle_s)):.1f})" in need.text
    assert any("a filter adds all of them up" in sentence for sentence in imager.sentences)


def test_nothing_to_see_is_an_answer():
    found = expose(request(), at="2027-11-25T15:00")
    assert not found.feasible
    assert "cannot be observed then" in found.sentences[0]
