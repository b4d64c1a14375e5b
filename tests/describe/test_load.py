"""From files to records: what extends merges, what a request brings together, who is cited."""

import math

import pytest
import yaml

from coldglow.describe.load import load_any, load_instrument, load_request, load_target, names
from coldglow.describe.records import Budget, Estimate, Instrument, Orbit, Origin, Request, Target
from coldglow.describe.resolved import resolved, resolved_text
from coldglow.errors import DescriptionError, NotFoundError

REQUEST = """format: coldglow-request/1
name: mine
target: uranus
instruments: [echelle-8m]
dates: {first: 2027-09-01, last: 2027-12-01}
goal: {snr: 5}
"""


@pytest.mark.parametrize("name", names("target"))
def test_every_shipped_target_loads(name):
    target = load_target(name)
    assert "iau2015" in [system.name for system in target.rotation.systems]
    assert target.rotation.reason
    blocks = (target.rotation, target.figure, target.emission, target.continuum, target.cooling)
    assert all(block.source for block in (*blocks, *target.rotation.systems))


@pytest.mark.parametrize("name", names("instrument"))
def test_every_shipped_instrument_loads(name):
    instrument = load_instrument(name)
    assert instrument.name == name
    blocks = (instrument.sky, instrument.telescope, instrument.detector, instrument.operation)
    assert all(block.source for block in (*blocks, *instrument.settings))
    assert instrument.telescope.transmission <= 1 - instrument.telescope.emissivity
    if not isinstance(instrument.place, Orbit):
        assert 2600 <= instrument.place.height_m <= 4200  # what the atmosphere table covers


def test_every_example_loads(repository):
    examples = sorted((repository / "examples").glob("*.yaml"))
    assert len(examples) >= 5
    for path in examples:
        request = load_request(path)
        assert request.dates.first >= "2027"
        assert load_any(path) == request


def test_the_examples_cover_the_kinds_of_work(repository):
    requests = [load_request(path) for path in sorted((repository / "examples").glob("*.yaml"))]
    instruments = {use.instrument.opening.kind for request in requests for use in request.uses}
    assert instruments == {"slit", "ifu", "imager"}
    assert any(isinstance(use.instrument.place, Orbit) for request in requests for use in request.uses)
    assert any(len({use.instrument.place for use in request.uses}) > 1 for request in requests)


def test_extends_merges_blocks_replaces_lists_and_drops_what_is_empty(write):
    base = load_target("uranus")
    path = write(
        "mine.yaml",
        "format: coldglow-target/1\nextends: uranus\nname: Mine\n"
        "figure:\n  shell_height: 2000 km\n"
        "continuum:\n  albedo:\n    - [2 um, 0.5]\n"
        "emission:\n  column:\n  line_of_sight_column: 1e15 m-2\n",
    )
    mine = load_target(path)
    assert mine.name == "Mine"
    assert mine.body == "uranus"
    assert mine.figure.shell_height_m == 2e6
    assert mine.figure.equatorial_radius_m == base.figure.equatorial_radius_m
    assert mine.continuum.albedo == (0.5,)
    assert mine.emission.given_as == "line-of-sight"
    assert mine.rotation == base.rotation


def test_the_file_that_wrote_the_value_is_cited(write):
    write("base.yaml", "format: coldglow-target/1\nextends: uranus\nfigure:\n  shell_height: 3 s\n")
    path = write(
        "mine.yaml", "format: coldglow-target/1\nextends: ./base.yaml\nemission:\n  temperature: 1 s\n"
    )
    with pytest.raises(DescriptionError) as raised:
        load_target(path)
    where = [(problem.file, problem.line, problem.key) for problem in raised.value.problems]
    assert sorted(where) == [
        (str(path.with_name("base.yaml")), 4, "figure.shell_height"),
        (str(path), 4, "emission.temperature"),
    ]


def test_the_origin_tells_where_a_value_was_written(write):
    path = write("mine.yaml", "format: coldglow-target/1\nextends: uranus\nfigure:\n  shell_height: 3 km\n")
    origin = load_target(path).origin
    assert origin.locate("figure.shell_height") == (str(path), 4)
    assert origin.locate("figure.polar_radius")[0].endswith("uranus.yaml")
    assert origin.locate("figure.nonsense") == (str(path), 3)


def test_a_chain_of_extends_that_is_too_long(write):
    for number in range(12):
        write(f"t{number}.yaml", f"format: coldglow-target/1\nextends: ./t{number + 1}.yaml\n")
    with pytest.raises(DescriptionError, match="circle"):
        load_target("./t0.yaml")


def test_a_request_brings_together_what_it_names(write):
    write("mine.yaml", "format: coldglow-target/1\nextends: uranus\nname: Mine\n")
    text = REQUEST.replace("uranus", "./mine.yaml").replace("[echelle-8m]", "echelle-8m")
    request = load_request(write("request.yaml", text))
    assert request.target.name == "Mine"
    assert request.uses[0].setting == load_instrument("echelle-8m").settings[0]
    assert request.longitudes == "auroral"
    assert request.coverage.snr == 5  # the goal of the whole, in every bin
    assert (request.fade.first_year, request.fade.last_year) == (2027, 2047)


def test_limits_of_the_request_lie_over_those_of_the_instrument(write):
    request = load_request(write("request.yaml", REQUEST + "limits:\n  airmass_max: 1.5\n"))
    limits = request.uses[0].instrument.limits
    assert limits.airmass_max == 1.5
    assert limits.moon_separation_min_rad == load_instrument("echelle-8m").limits.moon_separation_min_rad
    assert request.uses[0].instrument.origin.locate("limits.airmass_max")[1] == 8


def test_all_mistakes_of_request_target_and_instrument_at_once(write):
    write("t.yaml", "format: coldglow-target/1\nextends: uranus\nfigure:\n  shell_height: 3 s\n")
    write("i.yaml", "format: coldglow-instrument/1\nextends: echelle-4m\ndetector:\n  dark: 3\n")
    text = REQUEST.replace("uranus", "./t.yaml").replace("[echelle-8m]", "[./i.yaml, none]")
    with pytest.raises(DescriptionError) as raised:
        load_request(write("request.yaml", text.replace("snr: 5", "snr: five")))
    assert {problem.key for problem in raised.value.problems} == {
        "figure.shell_height",
        "detector.dark",
        "instruments.1",
        "goal.snr",
    }


def test_nights_may_be_single_halves_or_spans(write):
    text = REQUEST.replace(
        "last: 2027-12-01}",
        "last: 2027-12-01, unit: half-night, offered: [2027-09-03 to 2027-09-05, 2027-10-01 first], "
        "forbidden: 2027-09-04}",
    )
    dates = load_request(write("request.yaml", text)).dates
    assert dates.offered == ("2027-09-03", "2027-09-04", "2027-09-05", "2027-10-01 first")
    assert dates.forbidden == ("2027-09-04",)


def test_a_coverage_goal_follows_from_the_goal(write):
    only_kelvin = load_request(write("a.yaml", REQUEST.replace("snr: 5", "temperature_error: 20 K")))
    assert (only_kelvin.coverage.snr, only_kelvin.coverage.temperature_error_k) == (None, 20)
    only_column = load_request(write("b.yaml", REQUEST.replace("snr: 5", "column_error: 10 %")))
    assert only_column.coverage.minutes == 30


def test_load_any_follows_the_format_line_or_the_name(repository):
    assert isinstance(load_any("uranus"), Target)
    assert isinstance(load_any("echelle-4m"), Instrument)
    assert isinstance(load_any(repository / "targets" / "neptune.yaml"), Target)
    assert isinstance(load_any(repository / "instruments" / "ifu-8m.yaml"), Instrument)
    assert isinstance(load_any(str(repository / "examples" / "uranus-season.yaml")), Request)
    with pytest.raises(NotFoundError):
        load_any("no-such-thing")


def test_a_missing_request():
    with pytest.raises(NotFoundError, match="cannot be read"):
        load_request("nowhere.yaml")


def test_paths_in_a_description_start_at_its_folder(write):
    write("data/air.csv", "")
    write("data/de.bsp", "")
    write("data/stored.ecsv", "")
    write("data/i.yaml", "format: coldglow-instrument/1\nextends: echelle-8m\natmosphere: air.csv\n")
    write("data/t.yaml", "format: coldglow-target/1\nextends: uranus\nbody: stored.ecsv\n")
    text = REQUEST.replace("uranus", "./data/t.yaml").replace("echelle-8m", "./data/i.yaml")
    request = load_request(write("request.yaml", text + "ephemeris: data/de.bsp\n"))
    assert request.uses[0].instrument.atmosphere.endswith("data/air.csv")
    assert request.target.body.endswith("data/stored.ecsv")
    assert request.ephemeris.endswith("data/de.bsp")
    assert load_request(write("request.yaml", REQUEST + "ephemeris: builtin\n")).ephemeris == "builtin"


def test_words_for_what_is_without_limit(write):
    path = write(
        "i.yaml",
        "format: coldglow-instrument/1\nextends: cold-space-ifu\n"
        "limits: {longest_visit: none}\noperation: {background_rows: MODEL}\n",
    )
    instrument = load_instrument(path)
    assert math.isinf(instrument.limits.longest_visit_s)
    assert math.isinf(instrument.operation.background_rows)


def test_uncertainties_may_be_shares_of_the_value():
    column = load_target("uranus").emission.column_m2
    assert column == Estimate(1e15, 0.4 * 1e15, 0.2 * 1e15)


def test_a_tree_of_a_later_version_is_refused_also_where_it_is_extended(write):
    write("new.yaml", "format: coldglow-target/3\nextends: uranus\n")
    with pytest.raises(DescriptionError, match="written in version 3 of the format"):
        load_target(write("mine.yaml", "format: coldglow-target/1\nextends: ./new.yaml\n"))


def test_an_atmosphere_of_ones_own_is_written_out_again(write):
    write("air.csv", "")
    text = "format: coldglow-instrument/1\nextends: echelle-8m\natmosphere: air.csv\n"
    instrument = load_instrument(write("i.yaml", text))
    again = load_instrument(write("again.yaml", resolved_text(instrument)))
    assert again == instrument


def test_an_instrument_needs_a_setting(write):
    block = resolved(load_instrument("echelle-4m")) | {"settings": {}}
    with pytest.raises(DescriptionError, match="settings: there is no setting; at least one"):
        load_instrument(write("i.yaml", yaml.safe_dump(block)))


def test_an_origin_that_knows_nothing_says_so():
    assert Origin("x.yaml").locate("emission.column") is None


@pytest.mark.parametrize(
    ("budget", "nights", "hours", "allowed"),
    [
        (Budget(None, None), 1e4, 1e5, True),
        (Budget(3.0, None), 3.0, 1e5, True),
        (Budget(3.0, None), 3.5, 1.0, False),
        (Budget(3.0, 20.0), 2.0, 20.0, True),
        (Budget(3.0, 20.0), 2.0, 20.5, False),
    ],
)
def test_a_budget_is_of_nights_and_of_hours(budget, nights, hours, allowed):
    assert budget.allows(nights, hours) is allowed
