"""The public interface: one import, light, complete, and the same answers as the command line."""

import shlex
import subprocess
import sys
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest

import coldglow
from coldglow import answers, cli
from coldglow.report.reading import read_result

ROOT = Path(__file__).parent.parent


def test_the_import_is_light():
    code = (
        "import sys, coldglow; print(sorted({'numpy', 'scipy', 'astropy', 'yaml', 'pydantic', 'matplotlib'} "
        "& {*sys.modules}))"
    )
    found = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert found.stdout == "[]\n"


def test_there_is_a_function_for_every_command():
    commands = set(cli.COMMANDS) - {"completion"}
    assert commands == set(answers.__all__)
    assert commands - {"plan", "sky"} <= set(coldglow.__all__)
    for name in coldglow.__all__:
        assert callable(getattr(coldglow, name))
        assert name in dir(coldglow)


def test_plan_and_sky_are_packages_at_the_top():
    import coldglow.plan
    import coldglow.sky

    assert not callable(coldglow.plan)
    assert callable(answers.plan)
    assert callable(answers.sky)


def test_what_is_not_there_is_an_attribute_error():
    with pytest.raises(AttributeError, match="no attribute 'magic'"):
        _ = coldglow.magic


def test_the_stub_names_what_is_public():
    stub = (ROOT / "src" / "coldglow" / "__init__.pyi").read_text(encoding="utf-8")
    for name in coldglow.__all__:
        assert f"import {name} as {name}" in stub


def test_results_print_show_and_round_trip(tmp_path):
    result = coldglow.glow("uranus", band=("3.9 um", "4.0 um"))
    assert "Q(1,0)" in str(result)
    html = result._repr_html_()
    assert html.count("<table") >= 1
    assert "Q(1,0)" in html
    for name in ("glow.ecsv", "glow.json"):
        back = read_result(result.write(tmp_path / name))
        np.testing.assert_array_equal(back["radiance"], result["radiance"])
        assert back.table().column("radiance").unit == "W m-2 sr-1"
        assert back.header["temperature"].value == result.header["temperature"].value
    assert str(result.qtable()["radiance"].unit) == "W / (sr m2)"


OFFLINE = [name for name in cli.COMMANDS if name != "fetch"]


@pytest.mark.parametrize("name", OFFLINE)
def test_the_example_in_the_help_of_every_command_runs(name, monkeypatch, tmp_path, capsys):
    (tmp_path / "examples").symlink_to(ROOT / "examples")
    monkeypatch.chdir(tmp_path)
    words = shlex.split(cli.COMMANDS[name].example.split(">")[0])
    assert words[0] == "coldglow"
    if name == "check":  # of the file that the example of `draft` makes
        (tmp_path / "my.yaml").write_text(answers.draft("uranus", "echelle-4m"), encoding="utf-8")
    assert cli.main(words[1:]) == 0
    out, err = capsys.readouterr()
    assert err == ""
    assert len(out) > 50
    for option, place in pairwise(words):
        if option in ("--out", "--write"):
            assert (tmp_path / place).exists()
