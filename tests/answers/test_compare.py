from concurrent.futures import ProcessPoolExecutor, ThreadPoolExecutor
from dataclasses import replace
from multiprocessing import get_context
from pathlib import Path

import numpy as np
import pytest

from coldglow.answers.common.jobs import processes
from coldglow.answers.compare import compare, rivals
from coldglow.answers.expose import expose
from coldglow.answers.nights import nights
from coldglow.cli import parse
from coldglow.describe.load import load_instrument, load_request, load_target, names
from coldglow.describe.records import Use
from coldglow.errors import DateError, DescriptionError, NotFoundError, RangeError

EXAMPLES = Path(__file__).parents[2] / "examples"
THREE = ["echelle-8m", "longslit-4m", "cold-space-ifu"]


def request(name="uranus-season", target="", first="2027-11-20", last="2027-12-03"):
    found = load_request(EXAMPLES / f"{name}.yaml")
    if target:
        found = replace(found, target=load_target(target))
        found = replace(found, longitudes=found.target.rotation.systems[0].name)
    goal, coverage = replace(found.goal, snr=10.0), replace(found.coverage, asked=False)
    dates = replace(found.dates, first=first, last=last, offered=(), forbidden=())
    return replace(found, dates=dates, goal=goal, coverage=coverage)


@pytest.fixture(scope="module")
def three():
    return compare(request(), THREE)


def rows(result, instrument):
    table = result.table()
    return [
        {column.name: column.values[i] for column in table.columns}
        for i in range(len(table))
        if table["instrument"][i] == instrument
    ]


def assert_same(one, other):
    """Equal bit for bit."""
    assert one.sentences == other.sentences
    for mine, theirs in zip(one.table().columns, other.table().columns, strict=True):
        assert mine.name == theirs.name
        assert mine.values.tobytes() == theirs.values.tobytes()


@pytest.mark.parametrize("name", ["echelle-8m", "ifu-8m", "narrowband-3m", "cold-space-ifu"])
def test_one_instrument_is_what_expose_and_nights_say(name):
    asked, record = request(first="2028-01-20", last="2028-01-29"), load_instrument(name)
    for row in rows(compare(asked, [record]), name):
        setting = next(each for each in record.settings if each.name == row["setting"])
        alone = replace(asked, uses=(Use(record, setting),))
        exposed, planned = expose(alone), nights(alone)
        assert row["time_to_goal"] == exposed.header["time_to_goal"].value
        if name == "echelle-8m":  # that of the best night, which is longer than an hour
            short = expose(alone, clock="1 h").header["systematic_temperature"].value
            assert 0.5 * short < row["systematic_error"] < short or np.isinf(short)
        assert row["feasible"] == (exposed.feasible and planned.feasible)
        if "nights" in planned.header:
            assert row["nights_needed"] == planned.header["nights"].value
        else:
            assert np.isinf(row["nights_needed"])


def test_the_request_keeps_its_own_instruments_cost_and_limits():
    asked = request()
    assert asked.uses[0].instrument.limits.airmass_max == pytest.approx(1.8)
    costly = replace(asked, uses=(replace(asked.uses[0], cost_per_night=0.8),))
    ((first, *_), (other, *_)) = rivals(costly, ["echelle-8m", "longslit-4m"])
    assert (first.cost_per_night, other.cost_per_night) == (0.8, 1.0)
    assert other.instrument.limits.airmass_max == pytest.approx(1.8)  # the request's limits are laid over it
    assert load_instrument("longslit-4m").limits.airmass_max != pytest.approx(1.8)


def test_all_that_ship_and_their_settings_by_default():
    found = rivals(request())
    assert sorted(uses[0].instrument.name for uses in found) == sorted(names("instrument"))
    for uses in found:
        assert tuple(use.setting for use in uses) == uses[0].instrument.settings


def test_an_instrument_of_the_requests_own_is_among_them():
    asked = request()
    mine = replace(asked.uses[0].instrument, name="mine")
    found = rivals(replace(asked, uses=(Use(mine, mine.settings[0]),)))
    assert found[-1][0].instrument.name == "mine"
    assert len(found) == len(names("instrument")) + 1


def test_best_first(three):
    table = three.table()
    assert list(table["feasible"]) == sorted(table["feasible"], reverse=True)
    good = table["feasible"]
    assert list(table["nights_needed"][good]) == sorted(table["nights_needed"][good])
    assert "time_to_goal" in [column.name for column in table.columns]
    first = f"{table['instrument'][0]} ({table['setting'][0]})"
    assert three.sentences[0].startswith(f"Best is {first}: ")


def test_refusals_are_rows_with_their_reason():
    found = compare(request(target="jupiter"), ["echelle-8m", "longslit-4m"])
    for row in rows(found, "echelle-8m"):
        assert not row["feasible"]
        assert row["limited_by"] == "nod"
        assert "Nods within the opening" in row["reason"]
        assert np.isinf(row["time_to_goal"])
        assert any(said.startswith("Not echelle-8m (") and row["setting"] in said for said in found.sentences)


def test_no_line_and_no_such_line_and_saturation_and_darkness():
    asked = request()
    bright = load_instrument("longslit-4m")
    slow = replace(bright, name="slow", detector=replace(bright.detector, shortest_s=500.0, longest_s=600.0))
    empty = replace(
        bright, name="empty", settings=(replace(bright.settings[0], band_m=(2.70e-6, 2.7001e-6)),)
    )
    shut = replace(bright, name="shut", limits=replace(bright.limits, altitude_min_rad=1.56))
    found = compare(asked, [slow, empty, shut])
    limits = {row["limited_by"] for name in ("slow", "empty", "shut") for row in rows(found, name)}
    assert {"saturation", "visibility"} <= limits
    assert not found.feasible
    assert found.sentences[0] == "None of these settings does it."
    other = compare(replace(asked, goal=replace(asked.goal, lines=("Q(1,0)",))), ["longslit-4m"])
    reasons = {row["setting"]: row["limited_by"] for row in rows(other, "longslit-4m")}
    assert reasons["overtone"] == "no such line"
    assert reasons["q-branch"] != "no such line"


def test_unknown_names_and_dates_are_mistakes_not_rows():
    with pytest.raises(NotFoundError, match="echelle-8m"):
        compare(request(), ["echele-8m"])
    with pytest.raises(DateError, match="2060"):
        compare(request(first="2060-01-01", last="2060-01-05"), ["echelle-8m"])


def test_threads_give_the_same_answer(three):
    with ThreadPoolExecutor(2) as executor:
        assert_same(compare(request(), THREE, executor), three)


def test_fresh_processes_give_the_same_answer_bit_for_bit(three):
    with ProcessPoolExecutor(2, get_context("spawn")) as executor:
        assert_same(compare(request(), THREE, executor), three)


def test_a_dask_cluster_gives_the_same_answer(three, monkeypatch):
    distributed = pytest.importorskip("distributed", reason="dask's distributed is not installed")
    options = {"n_workers": 1, "threads_per_worker": 2, "processes": False, "dashboard_address": None}
    monkeypatch.setattr(
        "distributed.comm.inproc.get_ip", lambda: "127.0.0.1"
    )  # it asks the network who we are
    with distributed.LocalCluster(**options) as cluster, distributed.Client(cluster) as client:
        assert_same(compare(request(), THREE, client.get_executor()), three)


def test_jobs():
    with processes(1) as executor:
        assert executor is None
    with pytest.raises(RangeError, match="0 jobs"), processes(0):
        pass


def test_a_list_of_instruments_gives_the_request_back():
    words = ["compare", "--instruments", "echelle-8m", "ifu-8m", "mine.yaml", "--jobs", "2"]
    _, parsed = parse(words)
    assert (parsed.word, parsed.instruments, parsed.jobs) == ("mine.yaml", ["echelle-8m", "ifu-8m"], 2)


def test_an_imager_tells_no_temperature(three):
    found = compare(request(), ["narrowband-3m"])
    assert np.all(np.isinf(found["temperature_error"]))
    assert np.all(np.isfinite(three["temperature_error"][three["feasible"]]))


def test_a_broken_file_that_nobody_asked_for_is_left_out(tmp_path, monkeypatch):
    (tmp_path / "broken.yaml").write_text("format: coldglow-instrument/1\nextends: echelle-8m\nnonsense: 1\n")
    asked = request()
    monkeypatch.chdir(tmp_path)
    assert "echelle-8m" in {uses[0].instrument.name for uses in rivals(asked)}
    with pytest.raises(DescriptionError, match="nonsense"):
        rivals(asked, [str(tmp_path / "broken.yaml")])
