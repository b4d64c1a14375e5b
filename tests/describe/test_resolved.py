"""A record written out loads again and is equal to the last bit; defaults are known as such."""

import dataclasses
import os
import tempfile
from pathlib import Path

import pytest
import strategies
from hypothesis import HealthCheck, given, settings

from coldglow.describe.load import load_any, load_instrument, load_request, load_target, names
from coldglow.describe.records import Estimate
from coldglow.describe.resolved import assumed, resolved, resolved_text

relaxed = settings(
    max_examples=60, deadline=None, suppress_health_check=[HealthCheck.too_slow, HealthCheck.data_too_large]
)


def again(record):
    handle, name = tempfile.mkstemp(suffix=".yaml")
    os.close(handle)
    try:
        Path(name).write_text(resolved_text(record), encoding="utf-8")
        return load_any(Path(name))
    finally:
        Path(name).unlink()


@pytest.mark.parametrize("name", names("target"))
def test_a_shipped_target_returns(name):
    assert again(load_target(name)) == load_target(name)


@pytest.mark.parametrize("name", names("instrument"))
def test_a_shipped_instrument_returns(name):
    assert again(load_instrument(name)) == load_instrument(name)


def test_an_example_returns_from_one_file_that_says_all(repository):
    for path in sorted((repository / "examples").glob("*.yaml")):
        request = load_request(path)
        assert again(request) == request
        assert resolved_text(again(request)) == resolved_text(request)


@relaxed
@given(strategies.targets())
def test_any_target_returns(target):
    assert again(target) == target


@relaxed
@given(strategies.instruments())
def test_any_instrument_returns(instrument):
    assert again(instrument) == instrument


@relaxed
@given(strategies.requests())
def test_any_request_returns(request):
    assert again(request) == request


def test_a_line_of_sight_column_returns_within_rounding():
    target = load_target("neptune")
    emission = dataclasses.replace(
        target.emission, given_as="line-of-sight", column_m2=Estimate(1.7e14, 3.1e13, 0.0)
    )
    back = again(dataclasses.replace(target, emission=emission)).emission
    assert back.given_as == "line-of-sight"
    assert back.column_m2.value == pytest.approx(1.7e14, rel=1e-15)
    assert back.column_m2.uncertainty == pytest.approx(3.1e13, rel=1e-15)


def test_each_quantity_has_its_unit():
    block = resolved(load_instrument("echelle-4m"))
    assert block["telescope"]["aperture"] == "3.6 m"
    assert block["settings"]["q-branch"]["band"] == ["3.93 um", "4 um"]
    assert block["sky"]["airglow"] == "400 ph s-1 m-2 arcsec-2 um-1"
    assert resolved(load_target("uranus"))["emission"]["temperature"] == {
        "value": "430 K",
        "uncertainty": "25 K",
        "scatter": "15 K",
    }


def test_defaults_are_what_no_file_wrote(repository):
    request = load_request(repository / "examples" / "cold-giant-limit.yaml")
    defaults = dict(assumed(request))
    assert defaults["weather.clear_fraction"] == "0.7"
    assert defaults["longitudes"] == "iii"
    assert "goal.snr" not in defaults
    assert not [key for key in defaults if key.startswith(("target", "instruments", "dates.offered"))]
    assert dict(assumed(load_target("uranus"))) == {"emission.lte_fraction": "1"}
