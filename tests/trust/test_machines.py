"""Other years, other machines: the clock, the network, the locale, the zone, folders that refuse writing."""

import os
import stat
import subprocess
import sys
import zipfile
from pathlib import Path

import pytest
import time_machine

from coldglow import cli
from coldglow.answers import hours
from coldglow.encodings import plain_character

ROOT = Path(__file__).parents[2]
CODE = (
    "import sys, socket\n"
    "def refuse(*words): raise AssertionError('the network was asked for')\n"
    "socket.socket.connect = socket.getaddrinfo = socket.create_connection = refuse\n"
    "from coldglow.cli import main\n"
    "sys.exit(main(sys.argv[1:]))\n"
)


def run(words, folder, code=CODE, encoding="utf-8", **environment):
    """Run the command in a process of its own, warnings as errors, offline; return what it printed."""
    kept = {key: value for key, value in os.environ.items() if key not in ("LC_ALL", "LANG", "TZ", "HOME")}
    found = subprocess.run(
        [sys.executable, "-W", "error", "-c", code, *map(str, words)],
        env={**kept, "HOME": str(folder), **environment},
        cwd=folder,
        capture_output=True,
        text=True,
        encoding=encoding,
    )
    assert found.returncode == 0, found.stderr
    # matplotlib itself says where it keeps its fonts when there is no home for them
    strange = [line for line in found.stderr.splitlines() if "atplotlib" not in line]
    assert strange == []
    return found.stdout


YEARS = (2027, 2031, 2045)
SOON = ("last_year: 2047", "last_year: 2028")


def test_the_answer_does_not_depend_on_the_day_it_is_asked(write):
    request = write()
    now = str(hours(request))
    for year in YEARS:
        with time_machine.travel(f"{year}-03-01T12:00:00+00:00"):
            assert str(hours(request)) == now


def test_the_same_folder_whenever_it_is_made(write, tmp_path):
    request, made = write(SOON, nights=("2027-11-20", "2027-11-20")), []
    for year in YEARS:
        with time_machine.travel(f"{year}-03-01T12:00:00+00:00"):
            assert cli.main(["plan", str(request), "--out", str(tmp_path / str(year))]) == 0
        folder = tmp_path / str(year)
        made.append({str(file.relative_to(folder)): file.read_bytes() for file in _files(folder)})
    assert "report.html" in made[0]
    for other in made[1:]:
        assert list(other) == list(made[0])
        assert [name for name in other if other[name] != made[0][name]] == []


def _files(folder):
    return [path for path in sorted(folder.rglob("*")) if path.is_file()]


PLACES = {
    "plain C": {"LC_ALL": "C", "TZ": "UTC"},
    "a locale that is not there": {"LC_ALL": "tr_TR.UTF-8", "LANG": "tr_TR.UTF-8", "TZ": "Asia/Kathmandu"},
    "far east": {"LC_ALL": "C.UTF-8", "TZ": "Pacific/Kiritimati"},
    "far west": {"LC_ALL": "C.UTF-8", "TZ": "Etc/GMT+12"},
    "without UTF-8": {"LC_ALL": "POSIX", "PYTHONIOENCODING": "utf-8", "PYTHONUTF8": "0", "TZ": "UTC"},
}


def test_the_same_words_in_every_locale_and_zone(write, tmp_path):
    request = write()
    said = {name: run(["hours", request], tmp_path, **place) for name, place in PLACES.items()}
    assert "best from" in said["plain C"]
    assert {name: text for name, text in said.items() if text != said["plain C"]} == {}


LOCALES = {"de_DE.UTF-8": "utf-8", "tr_TR.ISO-8859-9": "iso-8859-9"}  # decimal comma; dotless i, few letters
SPOKEN = CODE.replace(
    "from coldglow",
    "import locale\n"
    "locale.setlocale(locale.LC_ALL, '')\n"
    "assert locale.localeconv()['decimal_point'] == ',', 'the locale is not in effect'\n"
    "from coldglow",
    1,
)


@pytest.fixture(scope="module")
def locales(tmp_path_factory):
    """Folder of locales that are made for the test; skipped where their sources are not installed."""
    folder = tmp_path_factory.mktemp("locales")
    for name in LOCALES:
        language, _, letters = name.partition(".")
        try:
            words = ["localedef", "-i", language, "-f", letters, str(folder / name)]
            subprocess.run(words, check=True, capture_output=True)
        except (OSError, subprocess.CalledProcessError) as error:
            if os.environ.get("COLDGLOW_LOCALES_REQUIRED"):
                raise
            pytest.skip(f"no sources of locales here: {error}")
    return folder


@pytest.mark.parametrize("name", LOCALES)
def test_the_same_answer_in_locales_with_other_commas_and_letters(write, tmp_path, locales, name):
    request = write(SOON, nights=("2027-11-20", "2027-11-20"))
    place = {"LC_ALL": name, "LOCPATH": str(locales)}
    said = run(["hours", request], tmp_path, SPOKEN, LOCALES[name], **place)
    lacking = {letter for letter in str(hours(request)) if not encodable(letter, LOCALES[name])}
    assert bool(lacking) == (name != "de_DE.UTF-8")
    assert said == "".join(
        plain_character(letter) if letter in lacking else letter for letter in f"{hours(request)}\n"
    )
    if not lacking:
        return
    run(["plan", request, "--out", tmp_path / "plain"], tmp_path, LC_ALL="C.UTF-8")
    run(["plan", request, "--out", tmp_path / "foreign"], tmp_path, SPOKEN, LOCALES[name], **place)
    plain, foreign = (
        {file.relative_to(tmp_path / folder): file.read_bytes() for file in _files(tmp_path / folder)}
        for folder in ("plain", "foreign")
    )
    assert plain == foreign


def encodable(letter, encoding):
    """Return whether the encoding has the letter."""
    return letter.encode(encoding, "ignore") != b""


def test_decimal_commas_of_a_locale_do_not_reach_the_numbers(write, monkeypatch):
    """No such locale need be installed: the process is told that it has one."""
    import locale

    request = write()
    before = str(hours(request))
    monkeypatch.setattr(locale, "localeconv", lambda: {**locale._localeconv(), "decimal_point": ","})
    monkeypatch.setattr(locale, "getpreferredencoding", lambda do_setlocale=True: "ISO-8859-9")
    assert str(hours(request)) == before


@pytest.mark.skipif(os.name != "posix", reason="permissions as on Unix")
def test_from_a_read_only_folder_with_an_unwritable_home(write, tmp_path):
    request = write(SOON, nights=("2027-11-20", "2027-11-20"))
    shut = tmp_path / "shut"
    shut.mkdir()
    (shut / "request.yaml").write_bytes(request.read_bytes())
    shut.chmod(stat.S_IRUSR | stat.S_IXUSR)
    # whoever may write everywhere (the administrator) is given a home that is no folder at all
    home = shut if not os.access(shut, os.W_OK) else shut / "request.yaml"
    try:
        out = run(["hours", shut / "request.yaml"], shut, HOME=str(home))
        planned = run(
            ["plan", shut / "request.yaml", "--out", tmp_path / "out"],
            shut,
            HOME=str(home),
            XDG_CACHE_HOME=str(home),
            XDG_CONFIG_HOME=str(home),
        )
    finally:
        shut.chmod(stat.S_IRWXU)
    assert "best from" in out
    assert "report.html" in planned
    assert (tmp_path / "out" / "report.html").is_file()
    assert [path.name for path in shut.iterdir()] == ["request.yaml"]


def test_a_plan_from_a_wheel_in_another_folder(write, tmp_path):
    request = write(SOON, nights=("2027-11-20", "2027-11-20"))
    words = [sys.executable, "-m", "build", "--wheel", "--no-isolation", "--outdir", str(tmp_path), str(ROOT)]
    subprocess.run(words, check=True, capture_output=True, cwd=tmp_path)
    (wheel,) = tmp_path.glob("*.whl")
    place = tmp_path / "elsewhere"
    with zipfile.ZipFile(wheel) as packed:
        packed.extractall(place)
    run(["plan", request, "--out", tmp_path / "out"], tmp_path, PYTHONPATH=str(place))
    page = (tmp_path / "out" / "report.html").read_text(encoding="utf-8")
    assert "Uranus" in page


def test_only_a_report_loads_what_draws(write):
    """Figures need folders for fonts, and a second to load; the other commands need neither."""
    code = (
        "import sys\nfrom coldglow.cli import main\nstatus = main(sys.argv[1:])\n"
        "sys.exit(status or ('matplotlib' in sys.modules))"
    )
    for words in (["hours", str(write())], ["glow", "uranus"]):
        found = subprocess.run([sys.executable, "-c", code, *words], capture_output=True, text=True)
        assert found.returncode == 0, found.stderr
