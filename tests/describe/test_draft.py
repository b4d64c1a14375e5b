"""A draft is valid as it stands, for every pair of what ships, and says what could be changed."""

import re

import pytest
import yaml

from coldglow.describe.draft import draft
from coldglow.describe.load import load_request, names
from coldglow.errors import NotFoundError


@pytest.mark.parametrize("target", names("target"))
@pytest.mark.parametrize("instrument", names("instrument"))
def test_every_pair_loads(write, target, instrument):
    request = load_request(write("draft.yaml", draft(target, instrument)))
    assert request.uses[0].instrument.name == instrument
    assert request.coverage.bins == 12
    assert request.fade.last_year == request.fade.first_year + 20


def test_lines_that_are_commented_out_are_right_too(write):
    text = draft("jupiter", "echelle-8m")
    for comment in ("forbidden", "offered", "fixed", "temperature_error", "column_error", "seeing", "spot"):
        changed, count = re.subn(rf"^  # ({comment}: .*)$", r"  \1", text, flags=re.MULTILINE)
        assert count == 1, comment
        assert load_request(write("draft.yaml", changed))
    limits = text.replace("# limits:", "limits:").replace("#   airmass_max", "  airmass_max")
    assert load_request(write("draft.yaml", limits)).uses[0].instrument.limits.airmass_max == 1.8


def test_comments_stand_in_one_column():
    columns = {
        line.index(" # ")
        for line in draft("uranus", "cold-space-ifu").splitlines()
        if " # " in line and not line.lstrip().startswith("#")
    }
    assert len(columns) == 1


def test_odd_names_are_quoted(write):
    name = "A: <b> # 'x' \"y\""
    written = yaml.safe_dump({"format": "coldglow-target/1", "extends": "uranus", "name": name})
    path = write("my target: #1.yaml", written)
    request = load_request(write("draft.yaml", draft(str(path), "echelle-4m")))
    assert request.target.name == name


def test_a_season_of_ones_own(write):
    text = draft("saturn", "ifu-8m", first="2031-03-01", last="2031-05-31")
    dates = load_request(write("draft.yaml", text)).dates
    assert (dates.first, dates.last) == ("2031-03-01", "2031-05-31")


def test_an_unknown_name():
    with pytest.raises(NotFoundError, match="did you mean `saturn`"):
        draft("satrun", "echelle-4m")
