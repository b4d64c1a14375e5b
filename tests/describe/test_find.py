"""Names and paths: what is found where, in which order."""

import dataclasses
from pathlib import Path

import pytest

from coldglow.describe import find
from coldglow.describe.load import load_instrument, load_instrument_for, load_request
from coldglow.errors import NotFoundError

TARGET = "format: coldglow-target/1\nextends: uranus\n"


def test_what_ships():
    assert {"jupiter", "saturn", "uranus", "neptune", "cold-giant"} <= set(find.names("target"))
    assert {
        "echelle-4m",
        "echelle-8m",
        "grating-8m",
        "longslit-4m",
        "ifu-8m",
        "narrowband-3m",
        "cold-space-ifu",
    } <= set(find.names("instrument"))


def test_the_working_folder_comes_before_the_path_and_both_before_what_ships(write, tmp_path, monkeypatch):
    elsewhere = write("library/targets/uranus.yaml", TARGET)
    monkeypatch.setenv("COLDGLOW_PATH", str(tmp_path / "library"))
    assert find.find("uranus", "target") == elsewhere
    write("uranus.yaml", TARGET)
    assert find.find("uranus", "target") == Path("uranus.yaml")
    assert find.find("saturn", "target").parent == find.shipped_folder("target")


def test_a_folder_of_the_path_may_hold_the_files_itself(write, tmp_path, monkeypatch):
    mine = write("library/mine.yaml", TARGET)
    monkeypatch.setenv("COLDGLOW_PATH", f"/nowhere:{tmp_path / 'library'}")
    assert find.find("mine", "target") == mine
    assert "mine" in find.names("target")
    assert "mine" not in find.names("instrument")


def test_a_request_named_like_a_planet_does_not_hide_it(write):
    write("uranus.yaml", "format: coldglow-request/1\nname: mine\n")
    assert find.find("uranus", "target").parent == find.shipped_folder("target")


def test_a_file_does_not_find_itself(write):
    mine = write("uranus.yaml", TARGET)
    assert find.find("uranus", "target", beside=mine).parent == find.shipped_folder("target")


def test_a_path_starts_at_the_folder_of_the_file_that_asks(write):
    base = write("deep/base.yaml", TARGET)
    assert find.find("./base.yaml", "target", beside=write("deep/mine.yaml", TARGET)) == base
    assert find.find(base, "target") == base
    with pytest.raises(NotFoundError, match=r"there is no target file `base\.yaml`"):
        find.find("base.yaml", "target")


def test_case_of_letters_does_not_matter():
    assert find.find("Uranus", "target").name == "uranus.yaml"


def test_the_nearest_name_is_suggested():
    with pytest.raises(NotFoundError, match="did you mean `neptune`"):
        find.find("neptun", "target")
    with pytest.raises(NotFoundError, match="there are cold-giant, jupiter"):
        find.find("qqqq", "target")


@pytest.mark.parametrize(
    "name", ["", "\x00", "a\nb", "x" * 5000, "../uranus", "/\x00/x.yaml", "x" * 5000 + ".yaml"]
)
def test_odd_names_are_not_found(name):
    with pytest.raises(NotFoundError):
        find.find(name, "target")


def test_package_data_comes_before_the_checkout(tmp_path, monkeypatch):
    monkeypatch.setattr(find, "files", lambda package: tmp_path / package)
    assert find.shipped_folder("target").name == "targets"  # no data inside: the checkout
    (tmp_path / "coldglow" / "data" / "targets").mkdir(parents=True)
    assert find.shipped_folder("target") == tmp_path / "coldglow" / "data" / "targets"


def test_a_folder_named_like_a_description_is_none(write, tmp_path):
    (tmp_path / "saturn.yaml").mkdir()
    write("other.txt", "")
    assert find.find("saturn", "target").parent == find.shipped_folder("target")
    assert "saturn" in find.names("target")


def test_another_instrument_is_seen_with_the_limits_of_the_request():
    request = load_request(Path(__file__).parents[2] / "examples" / "uranus-season.yaml")
    own = load_instrument("ifu-8m")
    assert request.uses[0].instrument.limits.airmass_max == 1.8
    assert own.limits.airmass_max != 1.8
    assert load_instrument_for(request, "ifu-8m").limits.airmass_max == 1.8
    # an airmass means nothing in space, and a request that stands in no file lays nothing over
    assert load_instrument_for(request, "cold-space-ifu").limits == load_instrument("cold-space-ifu").limits
    loose = dataclasses.replace(request, origin=dataclasses.replace(request.origin, file=""))
    assert load_instrument_for(loose, "ifu-8m").limits == own.limits
