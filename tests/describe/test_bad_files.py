"""Every wrong file of tests/data/bad gives exactly the problems listed in its index, in order."""

from pathlib import Path

import pytest
import yaml

from coldglow.describe.load import load_any
from coldglow.errors import DescriptionError

FOLDER = Path(__file__).parents[1] / "data" / "bad"
INDEX = yaml.safe_load((FOLDER / "index.yaml").read_text(encoding="utf-8"))


@pytest.mark.parametrize("name", sorted(INDEX))
def test_each_wrong_file_gives_its_problems_and_no_others(name):
    with pytest.raises(DescriptionError) as raised:
        load_any(FOLDER / name)
    problems = raised.value.problems
    assert [problem.line for problem in problems] == [row["line"] for row in INDEX[name]]
    for problem, row in zip(problems, INDEX[name], strict=True):
        assert row["says"] in str(problem)
        assert str(problem) in str(raised.value)


def test_the_index_lists_every_file_and_there_are_many():
    files = {path.name for path in FOLDER.iterdir()} - {"index.yaml"}
    assert files == set(INDEX)
    assert len(files) >= 60


@pytest.mark.parametrize("name", sorted(INDEX))
def test_problems_cite_the_file_that_wrote_the_value(name):
    with pytest.raises(DescriptionError) as raised:
        load_any(FOLDER / name)
    for problem in raised.value.problems:
        assert Path(problem.file).is_relative_to(FOLDER)
        content = Path(problem.file).read_bytes()
        assert 1 <= problem.line <= content.count(b"\n") + 1
