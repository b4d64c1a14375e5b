"""Reads, integrations and clock time against simulated reads and sums by hand."""

import dataclasses

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from coldglow.detect.integration import (
    choose_integration,
    clock_time,
    open_shutter_time,
    photon_variance_factor,
    read_variance_e2,
)
from coldglow.errors import SaturationError


@pytest.mark.parametrize("reads", [2, 4, 16])
def test_noise_of_a_fitted_ramp_as_simulated(make, reads):
    """Reads of a filling pixel with single-read noise sigma_p/sqrt(2), a straight line fitted to them."""
    detector = dataclasses.replace(
        make.instrument().detector, reads=reads, sampling="ramp", read_noise_pair_e=20.0
    )
    rng = np.random.default_rng(11)
    trials, rate = 40000, 400.0  # electrons in the whole integration
    # the fit's slope times the time from first to last read
    place = np.linspace(0.0, 1.0, reads)
    weight = (place - place.mean()) / np.sum((place - place.mean()) ** 2)
    noise = rng.normal(0.0, 20.0 / np.sqrt(2.0), (trials, reads)) @ weight
    electrons = rng.poisson(rate / (reads - 1), (trials, reads - 1)).cumsum(axis=1)
    photons = np.concatenate([np.zeros((trials, 1)), electrons], axis=1) @ weight
    spread = np.sqrt(2.0 / trials)  # relative error of a variance
    assert noise.var() == pytest.approx(read_variance_e2(detector), rel=5 * spread)
    assert photons.var() / rate == pytest.approx(photon_variance_factor(detector), rel=5 * spread)


def test_a_long_ramp_costs_a_fifth_more_photon_noise(make):
    # 6/5: Garnett & Forrest 1993, Proc. SPIE 1946, 395 (from memory)
    detector = dataclasses.replace(make.instrument().detector, reads=1000, sampling="ramp")
    assert photon_variance_factor(detector) == pytest.approx(1.2, rel=2e-3)


def test_more_pairs_average_their_noise(make):
    detector = make.instrument().detector
    one, sixteen = (dataclasses.replace(detector, reads=n) for n in (2, 32))
    assert read_variance_e2(one) == 400.0
    assert read_variance_e2(sixteen) == pytest.approx(400.0 / 16)
    assert photon_variance_factor(sixteen) == 1.0


def test_integration_stays_in_the_well_and_fills_the_nod(make):
    made = make.instrument()  # well 1e5 x 0.8, nod 120 s, readout 0.5 s, nod overhead 10 s, calibration 5 %
    plan = choose_integration(np.array([1.0, 1600.0, 2000.0]), made.detector, made.operation)
    # 8e4 e / 1600 e/s = 50 s: three of 40 s; 8e4 / 2000 = 40 s: three again
    assert plan.integration_s == pytest.approx([120.0, 40.0, 40.0])
    assert list(plan.coadds) == [1, 3, 3]
    assert plan.well_fill == pytest.approx([0.0012, 0.64, 0.8])
    assert plan.shutter_share == pytest.approx([120 / 130.5 * 0.95, 120 / 131.5 * 0.95, 120 / 131.5 * 0.95])


def test_a_stare_has_no_nods(make):
    made = make.instrument(operation={"nod": "stare"})
    plan = choose_integration(np.array([1.0]), made.detector, made.operation)
    assert plan.integration_s == pytest.approx([1200.0])
    assert plan.shutter_share == pytest.approx([1200 / 1200.5 * 0.95])


def test_saturation_names_the_longest_safe_integration(make):
    made = make.instrument()
    with pytest.raises(SaturationError, match=r"longest safe integration is 0\.08 s") as caught:
        choose_integration(np.array([10.0, 1e6]), made.detector, made.operation)
    assert caught.value.longest_safe_s == pytest.approx(0.08)
    assert caught.value.key == "detector.shortest"


@given(rate=st.floats(1e-3, 7e5), nod=st.floats(0.5, 5000.0))
def test_every_plan_is_allowed(make, rate, nod):
    made = make.instrument(operation={"nod_time_s": nod})
    plan = choose_integration(np.array([rate]), made.detector, made.operation)
    assert made.detector.shortest_s <= plan.integration_s[0] <= made.detector.longest_s
    assert plan.integration_s[0] * rate <= 8e4 * (1 + 1e-12)
    assert plan.well_fill[0] <= 0.8 * (1 + 1e-12)
    assert 0.0 < plan.shutter_share[0] < 1.0


@given(open_s=st.floats(1.0, 1e6), share=st.floats(0.05, 1.0))
def test_clock_time_and_back(make, open_s, share):
    operation = make.instrument(operation={"standards_s": 300.0}).operation
    clock_s = clock_time(open_s, share, operation)
    assert clock_s > open_s
    assert open_shutter_time(clock_s, share, operation) == pytest.approx(open_s, rel=1e-9)
    assert open_shutter_time(899.0, share, operation) == 0.0
