"""The README's examples print what it says they print."""

import doctest
import re
import shlex
from pathlib import Path

import pytest

from coldglow import cli

ROOT = Path(__file__).parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")
BLOCKS = [block for block in re.findall(r"^```console\n(.*?)^```$", README, re.DOTALL | re.MULTILINE)]


@pytest.mark.parametrize("block", BLOCKS, ids=lambda block: block.splitlines()[0][2:60])
def test_an_example_prints_what_the_readme_shows(block, capsys, monkeypatch, tmp_path):
    command, _, expected = block.partition("\n")
    words = shlex.split(command.removeprefix("$ coldglow "))
    monkeypatch.chdir(ROOT)
    if "--out" in words:
        words[words.index("--out") + 1] = str(tmp_path / words[words.index("--out") + 1])
        expected = expected.replace("uranus-plan", str(tmp_path / "uranus-plan"))
    assert cli.main(words) == 0
    got = capsys.readouterr().out
    checker = doctest.OutputChecker()
    flags = doctest.ELLIPSIS | doctest.NORMALIZE_WHITESPACE
    example = doctest.Example(command, expected)
    assert checker.check_output(expected, got, flags), checker.output_difference(example, got, flags)


def test_the_readme_has_examples():
    assert len(BLOCKS) >= 5


def test_the_first_two_shell_blocks_are_complete():
    blocks = re.findall(r"^```sh\n(.*?)^```$", README, re.DOTALL | re.MULTILINE)
    for block in blocks[:2]:
        assert "python3 -m venv" in block
        assert "pip install" in block
    assert "coldglow plan" in blocks[0]
    assert "pytest" in blocks[1]
