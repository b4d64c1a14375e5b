"""What was understood, in rows: the numbers that an observer would check first stand there."""

import strategies
from hypothesis import HealthCheck, given, settings

from coldglow.describe.load import load_instrument, load_request, load_target
from coldglow.describe.summary import summary


def test_a_target():
    rows = summary(load_target("uranus"))
    assert ("temperature", "430 ± 25 (scatter 15) K") in rows
    assert ("cooling", "linear, -8 ± 1.5 K yr-1 from 2023-11-01, floor 250 ± 50 K") in rows
    assert any("17.247864 h ± 1e-05 h" in value and "default" in value for _, value in rows)
    assert any(label == "column, line of sight" for label, _ in rows)


def test_spots_ovals_and_laws():
    assert [label for label, _ in summary(load_target("jupiter"))].count("oval") == 2
    rows = dict(summary(load_target("cold-giant")))
    assert rows["spot"] == "bright patch: 0.2 of all ions at latitude -30 deg, longitude 120 deg (iii)"
    assert rows["cooling"] == "exponential, time scale 15 ± 5 yr from 2027-01-01, floor 200 ± 20 K"


def test_instruments():
    assert dict(summary(load_instrument("cold-space-ifu")))["place"] == "sun-earth-l2"
    rows = dict(summary(load_instrument("narrowband-3m")))
    assert rows["place"] == "longitude +145.0000 deg (east), latitude -5.0000 deg, 3800 m"
    assert "off band 2.14 to 2.17 um" in rows["setting"]


def test_a_goal_without_snr(repository):
    rows = dict(summary(load_request(repository / "examples" / "uranus-space.yaml")))
    assert rows["goal"] == "temperature to 5 K; column to 5 %"


def test_a_request(repository):
    rows = summary(load_request(repository / "examples" / "neptune-two-sites.yaml"))
    assert [label for label, _ in rows].count("instrument") == 2
    assert ("goal", "SNR 3 in all lines of the setting with probability 0.9") in rows


@settings(deadline=None, suppress_health_check=[HealthCheck.too_slow, HealthCheck.data_too_large])
@given(strategies.requests())
def test_any_request_has_a_summary_without_blanks(request):
    for record in (request, request.target, request.uses[0].instrument):
        assert all(value for _, value in summary(record))
