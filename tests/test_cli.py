"""The command line as its users meet it: words in, text and an exit status out."""

import json
import os
import re
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from coldglow import cli
from coldglow.report.reading import read_result

ROOT = Path(__file__).parent.parent
SEASON = str(ROOT / "examples" / "uranus-season.yaml")


def run(capsys, *words):
    """Run the command line; return status, standard output and standard error."""
    status = cli.main(list(words))
    out, err = capsys.readouterr()
    return status, out, err


@pytest.fixture
def short(tmp_path):
    """A request for a few nights, so that tests stay quick."""
    text = Path(SEASON).read_text(encoding="utf-8")
    text = text.replace("first: 2027-09-01", "first: 2027-11-20").replace(
        "last: 2028-03-02", "last: 2027-11-23"
    )
    text = re.sub(r"  forbidden:.*?(?=\n  step:)", "", text, flags=re.DOTALL)
    path = tmp_path / "short.yaml"
    path.write_text(text, encoding="utf-8")
    return path


def test_help_lists_every_command_and_exits_0(capsys):
    status, out, _ = run(capsys, "--help")
    assert status == 0
    for name in cli.COMMANDS:
        assert f"\n  {name} " in out


@pytest.mark.parametrize("name", list(cli.COMMANDS))
def test_help_of_a_command_carries_its_example(capsys, name):
    status, out, _ = run(capsys, name, "--help")
    assert status == 0
    assert cli.COMMANDS[name].example.split()[1] == name
    assert cli.COMMANDS[name].example in out


def test_help_imports_nothing_heavy():
    code = (
        "import sys, coldglow.cli; coldglow.cli.main(['--help']);"
        "print(sorted({'numpy', 'astropy', 'yaml'} & {*sys.modules}))"
    )
    found = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert found.stdout.endswith("[]\n")


def test_no_command_and_a_wrong_one_are_wrong_input(capsys):
    assert run(capsys)[0] == 2
    status, _, err = run(capsys, "hour", SEASON)
    assert status == 2
    assert "`hours`" in err


def test_negative_numbers_and_lists_come_before_the_word(capsys):
    words = [
        "--site",
        "-70.4deg",
        "-24.6deg",
        "2600m",
        "--at",
        "2027-11-20T03:00",
        "2027-11-20T06:00",
        "uranus",
    ]
    status, out, err = run(capsys, "sky", *words)
    assert (status, err) == (0, "")
    other = run(capsys, "sky", "uranus", *words[:-1])
    assert other[1] == out
    assert "2027-11-20T03:00:00" in out
    assert "2027-11-20T06:00:00" in out


def test_bare_numbers_mean_the_unit_that_the_help_names(capsys):
    with_units = run(
        capsys, "glow", "uranus", "--temperature", "500K", "--column", "2e15 m-2", "--band", "3.4um", "4.1um"
    )
    bare = run(capsys, "glow", "uranus", "--temperature", "500", "--column", "2e15", "--band", "3.4", "4.1")
    assert with_units == bare
    assert with_units[0] == 0


def test_every_format_is_written_in_full(capsys, tmp_path):
    files = [tmp_path / f"glow.{suffix}" for suffix in ("ecsv", "csv", "json", "tex")]
    words = [word for file in files for word in ("--write", str(file))]
    status, _, _ = run(capsys, "glow", "uranus", "--temperature", "500K", "--band", "3.9um", "4um", *words)
    assert status == 0
    table = read_result(files[0])
    names = "wavelength wavenumber band label upper_energy einstein_a weight radiance photon_radiance share"
    assert [column.name for column in table.table().columns] == names.split()
    np.testing.assert_array_equal(table["radiance"], read_result(files[2])["radiance"])
    assert files[1].read_text(encoding="utf-8").startswith("wavelength,")
    assert "tabular" in files[3].read_text(encoding="utf-8")
    assert {"temperature", "column", "partition_function", "total_radiance"} <= set(table.header)


def test_the_columns_that_scripts_rely_on(capsys, short, tmp_path):
    wanted = {
        "sky": "time observable airmass altitude azimuth sub_observer_longitude sub_observer_latitude "
        "sub_solar_latitude pole_angle diameter phase_angle range_rate distance ra dec ra_icrs dec_icrs "
        "ra_rate dec_rate sun_altitude solar_elongation moon_separation",
        "expose": "clock_time shutter_time snr temperature_error column_error",
        "hours": "night start end duration airmass_min airmass_max longitude_start longitude_end range_rate "
        "line_transmission snr rank",
        "nights": "nights probability probability_error",
    }
    for name, columns in wanted.items():
        file = tmp_path / f"{name}.ecsv"
        words = [str(short)]
        if name == "sky":
            words = ["uranus", "--instrument", "echelle-8m", "--from", "2027-11-20", "--to", "2027-11-21"]
        assert run(capsys, name, *words, "--write", str(file))[0] == 0
        table = read_result(file)
        assert set(columns.split()) <= {column.name for column in table.table().columns}, name


def test_strict_turns_a_no_into_status_1(capsys, tmp_path, short):
    text = re.sub(r"(budget:\n  nights: )\d+", r"\g<1>0.5", short.read_text(encoding="utf-8"))
    text = re.sub(r"\ncoverage:.*?(?=\n\w)", "", text, flags=re.DOTALL)
    small = tmp_path / "small.yaml"
    small.write_text(text, encoding="utf-8")
    status, out, _ = run(capsys, "nights", str(small))
    assert status == 0
    assert "more than the budget of 0.5 nights: not feasible" in out
    assert run(capsys, "nights", str(small), "--strict")[0] == 1


def test_a_target_that_is_never_up_is_an_answer(capsys, tmp_path, short):
    text = short.read_text(encoding="utf-8")
    text = text.replace("2027-11-20", "2027-05-20").replace("2027-11-23", "2027-05-22")
    never = tmp_path / "never.yaml"
    never.write_text(text, encoding="utf-8")
    for name in ("hours", "expose", "nights"):
        status, out, err = run(capsys, name, str(never))
        assert (status, err) == (0, ""), name
        assert "never be observed" in out, name
        assert run(capsys, name, str(never), "--strict")[0] == 1


WRONG = [
    (["glow", "urans"], "uranus"),
    (["glow", "uranus", "--temperature", "500m"], "temperature"),
    (["glow", "uranus", "--temperature", "-5K"], "above 0 K"),
    (["glow", "uranus", "--band", "6um", "7um"], "1.9 to 5.5"),
    (["sky", "uranus", "--site", "0", "95", "0", "--at", "2027-01-01"], "-90..90"),
    (["sky", "uranus", "--site", "0", "5", "0", "--at", "2227-01-01"], "2227"),
    (["sky", "uranus", "--site", "0", "5", "0", "--at", "yesterday"], "yesterday"),
    (["sky", "uranus", "--site", "0", "5", "0"], "--from"),
    (["sky", "uranus", "--site", "0", "5", "0", "--from", "2027-01-02", "--to", "2027-01-01"], "before"),
    (["sky", "uranus", "--at", "2027-01-01"], "--site"),
    (["sky", "uranus", "--site", "0", "5", "0", "--at", "2027-01-01", "--longitudes", "iv"], "iau2015"),
    (["hours", "nothing.yaml"], "nothing.yaml"),
    (["hours"], "REQUEST.yaml"),
    (["hours", "a.yaml", "b.yaml"], "one REQUEST.yaml"),
    (["hours", SEASON, "--length", "0h"], "positive"),
    (["expose", SEASON, "--at", "2099-01-01T00:00"], "2099"),
    (["show", "urans"], "uranus"),
    (["draft", "--target", "uranus"], "--instrument"),
    (["glow", "uranus", "--write", "glow.docx"], "docx"),
    (["glow", "uranus", "--write", "no/such/folder/glow.csv"], "no/such/folder"),
]


@pytest.mark.parametrize(
    ("words", "part"), WRONG, ids=lambda value: " ".join(value) if isinstance(value, list) else ""
)
def test_wrong_input_is_status_2_and_a_sentence(capsys, words, part):
    status, _, err = run(capsys, *words)
    assert status == 2
    assert part in err
    assert "Traceback" not in err


def test_an_error_below_the_descriptions_names_file_and_line(capsys, tmp_path):
    machine = tmp_path / "bright.yaml"
    machine.write_text(
        "format: coldglow-instrument/1\nextends: echelle-8m\nname: bright\ndetector:\n  shortest: 100 s\n"
        "  longest: 200 s\n  full_well: 1000 e-\n",
        encoding="utf-8",
    )
    text = (
        Path(SEASON).read_text(encoding="utf-8").replace("instrument: echelle-8m", "instrument: bright.yaml")
    )
    asked = tmp_path / "asked.yaml"
    asked.write_text(text, encoding="utf-8")
    status, _, err = run(capsys, "expose", str(asked))
    assert status == 2
    assert "bright.yaml:5: detector.shortest:" in err
    assert "longest safe integration" in err


def test_a_draft_loads_and_is_checked(capsys, tmp_path):
    status, text, _ = run(capsys, "draft", "--target", "neptune", "--instrument", "ifu-8m")
    assert status == 0
    mine = tmp_path / "mine.yaml"
    mine.write_text(text, encoding="utf-8")
    status, out, err = run(capsys, "check", str(mine))
    assert (status, err) == (0, "")
    assert "ifu-8m" in out


def test_check_reports_the_mistakes_of_all_files_at_once(capsys, tmp_path):
    for name, line in (("one", "sped: 3"), ("two", "name: [")):
        (tmp_path / f"{name}.yaml").write_text(f"format: coldglow-request/1\n{line}\n", encoding="utf-8")
    status, _, err = run(capsys, "check", "one.yaml", "two.yaml")
    assert status == 2
    assert "one.yaml:2" in err
    assert "two.yaml:" in err


def test_show_writes_the_resolved_description(capsys, tmp_path):
    file = tmp_path / "uranus.json"
    assert run(capsys, "show", "uranus", "--write", str(file))[0] == 0
    found = json.loads(file.read_text(encoding="utf-8"))
    assert found["figure"]["equatorial_radius"] == "25559 km"


def test_an_internal_error_asks_for_a_report(capsys, monkeypatch):
    def broken(words):
        raise ZeroDivisionError("a fault of ours")

    command = cli.COMMANDS["show"]
    monkeypatch.setitem(
        cli.COMMANDS, "show", cli.Command(command.question, command.example, "", command.add, broken)
    )
    status, _, err = run(capsys, "show")
    assert status == 70
    assert "please report it" in err


def test_an_interruption_is_status_130(capsys, monkeypatch):
    def stopped(words):
        raise KeyboardInterrupt

    command = cli.COMMANDS["show"]
    monkeypatch.setitem(
        cli.COMMANDS, "show", cli.Command(command.question, command.example, "", command.add, stopped)
    )
    assert run(capsys, "show")[0] == 130


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="this system has no device that is always full")
def test_an_answer_that_cannot_be_written_is_told_in_a_sentence():
    words = [sys.executable, "-m", "coldglow.cli", "show"]
    with Path("/dev/full").open("w") as full:
        found = subprocess.run(words, stdout=full, stderr=subprocess.PIPE, text=True, check=False)
    assert found.returncode == 2
    assert "could not be written" in found.stderr
    assert "Traceback" not in found.stderr


def folder_contents(folder):
    return {
        str(p.relative_to(folder)): p.read_bytes() for p in sorted(Path(folder).rglob("*")) if p.is_file()
    }


def test_the_same_request_gives_the_same_folder(capsys, short):
    assert run(capsys, "plan", str(short), "--out", "one")[0] == 0
    # another process, another hash seed, another time zone
    environment = {**os.environ, "PYTHONHASHSEED": "7", "TZ": "Pacific/Kiritimati", "LC_ALL": "C"}
    words = [sys.executable, "-m", "coldglow.cli", "plan", str(short), "--out", "two"]
    subprocess.run(words, env=environment, check=True, capture_output=True)
    one, two = folder_contents("one"), folder_contents("two")
    assert list(one) == list(two)
    assert [name for name in one if one[name] != two[name]] == []
    assert {"report.html", "request.yaml"} <= set(one)


def test_an_existing_folder_is_not_overwritten(capsys, short):
    Path("taken").mkdir()
    Path("taken/mine.txt").write_text("mine", encoding="utf-8")
    status, _, err = run(capsys, "plan", str(short), "--out", "taken")
    assert status == 2
    assert "--force" in err
    assert run(capsys, "plan", str(short), "--out", "taken", "--force")[0] == 0
    assert Path("taken.1/mine.txt").read_text(encoding="utf-8") == "mine"
    assert Path("taken/report.html").is_file()


def test_the_resolved_request_of_a_plan_gives_the_same_plan(capsys, short):
    assert run(capsys, "plan", str(short), "--out", "one")[0] == 0
    assert run(capsys, "plan", "one/request.yaml", "--out", "two")[0] == 0
    one, two = folder_contents("one"), folder_contents("two")
    assert one["tables/hours.ecsv"] == two["tables/hours.ecsv"]
    assert one["request.yaml"] == two["request.yaml"]
