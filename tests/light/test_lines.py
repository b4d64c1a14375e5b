"""The packaged line list: against published lines, against its own rows as printed, and how it is asked."""

from __future__ import annotations

import re
import time

import numpy as np
import pytest

from coldglow.errors import NotFoundError, RangeError
from coldglow.light.lines import lines_in, load_levels, load_lines


@pytest.fixture(scope="module", name="lines")
def _lines():
    return load_lines()


def _published(light_rows, kind):
    chosen = [row for row in light_rows("h3p_published.csv") if row["kind"] == kind]
    assert chosen
    return chosen


def test_positions_against_published_lines(lines, light_rows):
    # Lindsay & McCall 2001, J. Mol. Spectrosc. 210, 60 (quoted from memory). Three of the rows were used in
    # no fit.
    chosen = _published(light_rows, "position")
    assert sum(row["role"] == "free" for row in chosen) == 3
    for row in chosen:
        index = lines.find(f"{row['band']} {row['label']}")
        assert lines.wavenumber_m1[index] / 100.0 == pytest.approx(
            float(row["value"]), abs=float(row["tolerance"])
        ), row["label"]


def test_einstein_coefficients_against_published_ones(lines, light_rows):
    # Neale, Miller & Tennyson 1996, ApJ 464, 516 and Geballe & Oka 1996, Nature 384, 334 (from memory), 1 %
    for row in _published(light_rows, "einstein_a"):
        index = lines.find(f"{row['band']} {row['label']}")
        assert lines.einstein_a_s[index] == pytest.approx(float(row["value"]), abs=float(row["tolerance"]))


def test_levels_against_published_ones(light_rows):
    # Lindsay & McCall 2001, J. Mol. Spectrosc. 210, 60 (from memory); (J, K) names ground-state levels
    energies_cm1 = load_levels().energy_m1 / 100.0
    for row in _published(light_rows, "level"):
        nearest = energies_cm1[np.argmin(np.abs(energies_cm1 - float(row["value"])))]
        assert nearest == pytest.approx(float(row["value"]), abs=float(row["tolerance"])), row["label"]


def test_packed_lines_are_the_printed_rows(lines, light_rows):
    sample = light_rows("h3p_lines.csv")
    assert len(sample) > 150
    for row in sample:
        index = int(np.argmin(np.abs(lines.wavenumber_m1 - 100.0 * float(row["wavenumber_cm1"]))))
        near = [
            i
            for i in range(max(index - 4, 0), min(index + 5, len(lines)))
            if lines.einstein_a_s[i] == float(row["einstein_a_s1"])
            and abs(lines.upper_energy_m1[i] - 100.0 * float(row["upper_cm1"])) < 1e-6
        ]
        assert len(near) == 1, row
        i = near[0]
        assert lines.wavenumber_m1[i] == pytest.approx(100.0 * float(row["wavenumber_cm1"]), rel=1e-12)
        assert lines.lower_energy_m1[i] == pytest.approx(100.0 * float(row["lower_cm1"]), rel=1e-12)
        assert (lines.upper_j[i], lines.lower_j[i]) == (int(row["upper_j"]), int(row["lower_j"]))
        assert lines.weight[i] == int(row["g_ns"]) * (2 * int(row["upper_j"]) + 1)
        assert (lines.band[i], lines.quality[i]) == (row["band"], row["class"])
        assert lines.label[i] == row["label"].replace(";", ",")


def test_list_is_whole_and_in_order(lines):
    assert len(lines) == 10143  # the count that the makers of the list state
    assert {q: lines.quality.count(q) for q in "ABCD"} == {"A": 146, "B": 784, "C": 3878, "D": 5335}
    assert np.all(np.diff(lines.wavelength_m) >= 0.0)
    assert 1.9e-6 <= lines.wavelength_m[0] < lines.wavelength_m[-1] <= 5.5e-6
    assert load_levels().energy_m1.size == 1865


def test_lines_obey_the_selection_rule_of_angular_momentum(lines):
    assert np.abs(lines.upper_j - lines.lower_j).max() == 1


def test_reading_takes_little_time():
    load_lines.cache_clear()
    load_levels.cache_clear()
    best = np.inf
    for _ in range(5):
        load_lines.cache_clear()
        start = time.process_time()
        load_lines()
        best = min(best, time.process_time() - start)
    assert best < 0.05  # 0.006 s measured


def test_a_label_is_found_in_its_usual_spellings(lines):
    index = lines.find("Q(1,0)")
    assert lines.band[index] == "v2-ground"
    assert (
        index == lines.find("Q(1;0)") == lines.find("v2-ground Q(1,0)") == lines.find(" v2-ground  Q(1;0) ")
    )


def test_a_wavelength_means_the_brightest_line_near_it(lines):
    # 3.953 um is how observers name Q(1,0)
    assert lines.label[lines.find(3.953e-6)] == lines.label[lines.find("3.953 um")] == "Q(1,0)"


def test_within_a_band_labels_still_point_to_the_same_line(lines):
    band = lines.within(3.9e-6, 4.0e-6)
    assert band.wavelength_m[band.find("Q(1,0)")] == lines.wavelength_m[lines.find("Q(1,0)")]
    assert np.all((band.wavelength_m >= 3.9e-6) & (band.wavelength_m <= 4.0e-6))


@pytest.mark.parametrize(
    ("wanted", "named"),
    [("Q(1,O)", "Q(1,0)"), ("Q(1", "quotes"), ("9.9 um", "nearest"), (2.95e-7, "nearest")],
)
def test_an_unknown_line_names_the_nearest(lines, wanted, named):
    with pytest.raises(NotFoundError, match=named.replace("(", r"\(").replace(")", r"\)")):
        lines.find(wanted)


def test_a_band_without_lines_is_refused():
    with pytest.raises(RangeError, match=r"1\.9 to 5\.5 um"):
        lines_in(1.0e-6, 1.2e-6)
    band = lines_in(3.9e-6, 4.0e-6)
    assert len(band) > 50
    assert band.wavelength_m.min() >= 3.9e-6


def test_only_well_placed_lines_can_be_called_hidden(lines):
    sigma = lines.position_sigma_m_s()
    placed = np.isin(lines.quality, ["A", "B"])
    assert np.all(sigma[placed] == 0.0)
    assert np.all(sigma[~placed] > 1.5e4)  # 0.3 cm-1 at 5 263 cm-1 is 17 km/s
    index = lines.quality.index("D")
    assert sigma[index] == pytest.approx(299792458.0 * lines.wavelength_m[index] / 0.01)


def test_a_label_means_its_brightest_line_and_no_fainter_one_that_happens_to_be_there():
    band = lines_in(3.90e-6, 4.05e-6)
    with pytest.raises(
        NotFoundError, match=r"R\(3,3\)l is the line of v2-ground at 3\.5336.* which is not"
    ) as refused:
        band.find("R(3,3)l")
    name = re.search("write '(.*)' for", str(refused.value)).group(1)
    assert f"{band.band[band.find(name)]} R(3,3)l" == name
