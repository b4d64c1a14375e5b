import socket
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from skyfield_places import SITE
from stand_in import answer, serving

from coldglow.answers.expose import expose
from coldglow.answers.fade import fade
from coldglow.answers.fetch import fetch
from coldglow.answers.hours import hours
from coldglow.answers.sky import sky
from coldglow.cli import main
from coldglow.describe.load import load_request, load_target
from coldglow.errors import OutputError, RangeError

EXAMPLES = Path(__file__).parents[2] / "examples"
PLACE = ["--site", "-68deg", "-25deg", "4300m"]
TIMES = ["--from", "2027-11-20", "--to", "2027-11-24"]


def asked_for(query):
    start, stop = (np.datetime64(query[key].replace(" ", "T")) for key in ("START_TIME", "STOP_TIME"))
    return answer(start, stop, int(query["STEP_SIZE"].removesuffix("m")))


@pytest.fixture
def service(monkeypatch):
    """Point astroquery at a stand-in on this machine."""
    from astroquery.jplhorizons import Conf

    with serving(asked_for) as (url, asked):
        monkeypatch.setattr(Conf, "horizons_server", url)
        yield asked


@pytest.fixture
def stored(service, tmp_path):
    path = tmp_path / "uranus.ecsv"
    result = fetch("uranus", site=SITE, first="2027-11-20", last="2027-11-24", step="3h", write=path)
    return path, result


def test_the_command_stores_the_table_and_says_so(service, tmp_path, capsys):
    path = tmp_path / "u.ecsv"
    assert main(["fetch", "uranus", *PLACE, *TIMES, "--step", "6h", "--write", str(path)]) == 0
    said = capsys.readouterr().out
    assert f"body: {path.name}" in said
    assert "for this place only" in said
    assert path.read_text(encoding="utf-8").startswith("# %ECSV")
    assert service[0]["COMMAND"] == "799"
    assert service[0]["STEP_SIZE"] == "360m"


def test_the_result_holds_what_was_stored(stored):
    path, result = stored
    names = [column.name for column in result.table().columns]
    assert {"time", "ra_icrs", "dec_icrs", "distance", "range_rate", "sun_distance"} <= set(names)
    assert result.header["answered"].value == "2027-09-06"
    assert str(result.header["file"]) == str(path)
    assert result.table().column("range_rate").unit == "km / s"


def test_a_stored_table_serves_as_body_of_a_target(stored, tmp_path):
    # the stand-in's rows come from skyfield with the packaged kernel, so the two targets are at one place
    path, _ = stored
    mine = tmp_path / "mine.yaml"
    mine.write_text(
        f"format: coldglow-target/1\nextends: uranus\nname: Mine\nbody: {path.name}\n", encoding="utf-8"
    )
    grid = {"site": SITE, "first": "2027-11-21", "last": "2027-11-23", "step": "2h"}
    one, other = sky(mine, **grid), sky("uranus", **grid)
    for name, tolerance in (
        ("ra", 1e-5),
        ("altitude", 1e-5),
        ("range_rate", 1e-4),
        ("sub_observer_longitude", 1e-3),
    ):
        np.testing.assert_allclose(one[name], other[name], atol=tolerance)
    request = load_request(EXAMPLES / "uranus-season.yaml")
    (use,) = request.uses
    there = replace(use, instrument=replace(use.instrument, place=SITE))
    dates = replace(request.dates, first="2027-11-21", last="2027-11-22", forbidden=())
    plain = replace(request, uses=(there,), dates=dates)
    changed = replace(plain, target=load_target(mine))
    np.testing.assert_allclose(hours(changed)["snr"], hours(plain)["snr"], rtol=1e-4)
    moment = "2027-11-22T03:00"
    snr = [expose(each, at=moment).table()["snr"] for each in (changed, plain)]
    np.testing.assert_allclose(*snr, rtol=1e-4)
    with pytest.raises(RangeError, match=r"mine\.yaml:4: body: .*made for the site at longitude -68"):
        expose(replace(request, target=load_target(mine), dates=dates))  # from the instrument's own place
    with pytest.raises(
        RangeError, match="2027-11-19 to 2027-11-24"
    ):  # the table ends long before a year does
        fade(changed, years=(2028, 2029))


def test_offline_is_a_sentence_and_status_2(monkeypatch, tmp_path, capsys):
    from astroquery.jplhorizons import Conf

    monkeypatch.setattr("time.sleep", lambda _: None)
    monkeypatch.setattr(
        "coldglow.bridges.horizons.fetch.__kwdefaults__",
        {"timeout_s": 1.0, "tries": 2, "pause": lambda _: None},
    )
    with socket.socket() as closed:  # a port on which nobody listens
        closed.bind(("127.0.0.1", 0))
        monkeypatch.setattr(Conf, "horizons_server", f"http://127.0.0.1:{closed.getsockname()[1]}/api")
        path = tmp_path / "u.ecsv"
        assert main(["fetch", "uranus", *PLACE, *TIMES, "--write", str(path)]) == 2
    said = capsys.readouterr().err
    assert "could not be reached" in said
    assert "Traceback" not in said
    assert not path.exists()


def test_mistakes_are_told_before_anything_is_asked(service, tmp_path, stored):
    path = tmp_path / "u.ecsv"
    whole = {"site": SITE, "first": "2027-11-20", "last": "2027-11-24", "write": path}
    service.clear()
    with pytest.raises(RangeError, match=r"--write FILE\.ecsv"):
        fetch("uranus", **(whole | {"write": tmp_path / "u.csv"}))
    with pytest.raises(RangeError, match="--from and --to"):
        fetch("uranus", **(whole | {"last": None}))
    with pytest.raises(RangeError, match="comes before"):
        fetch("uranus", **(whole | {"last": "2027-11-19"}))
    with pytest.raises(RangeError, match=r"a step of 0\.5 min"):
        fetch("uranus", **(whole | {"step": "30s"}))
    with pytest.raises(OutputError, match="no folder"):
        fetch("uranus", **(whole | {"write": tmp_path / "none" / "u.ecsv"}))
    with pytest.raises(RangeError, match="an instrument or a site"):
        fetch("uranus", **(whole | {"site": None}))
    with pytest.raises(RangeError, match="follows the stored table"):
        fetch(replace(load_target("uranus"), body=str(stored[0])), **whole)
    assert service == []


def test_the_command_wants_a_file(capsys):
    assert main(["fetch", "uranus", *PLACE, *TIMES]) == 2
    assert "--write FILE.ecsv" in capsys.readouterr().err
