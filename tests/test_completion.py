"""Shells complete what the command line takes."""

import shutil
import subprocess

import pytest

from coldglow import cli
from coldglow.describe.find import names

BASH = shutil.which("bash")


def script(capsys, shell):
    assert cli.main(["completion", shell]) == 0
    return capsys.readouterr().out


@pytest.fixture
def complete(capsys, tmp_path):
    """Words that bash offers for the last of some words."""
    path = tmp_path / "coldglow.bash"
    path.write_text(script(capsys, "bash"), encoding="utf-8")

    def offered(*words):
        line = " ".join(f"'{word}'" for word in words)
        code = f"source {path}; COMP_WORDS=({line}); COMP_CWORD={len(words) - 1}; _coldglow; "
        code += 'printf "%s\\n" "${COMPREPLY[@]}"'
        found = subprocess.run([BASH, "-c", code], capture_output=True, text=True, check=True)
        assert found.stderr == ""
        return found.stdout.split()

    return offered


needs_bash = pytest.mark.skipif(BASH is None, reason="no bash on this machine")


@needs_bash
def test_bash_completes_commands(complete):
    assert set(complete("coldglow", "")) == {*cli.COMMANDS, "--help", "--version"}
    assert set(complete("coldglow", "co")) == {"cover", "compare", "completion"}


@needs_bash
@pytest.mark.parametrize("name", list(cli.COMMANDS))
def test_bash_completes_every_option_of_every_command(complete, name):
    offered = complete("coldglow", name, "--")
    wanted = {o for action in cli.build_parser(name)._actions for o in action.option_strings if o[:2] == "--"}
    assert set(offered) == wanted


@needs_bash
def test_bash_completes_names_where_names_belong(complete):
    targets, instruments = names("target"), names("instrument")
    assert complete("coldglow", "glow", "") == targets
    assert complete("coldglow", "sky", "ur") == ["uranus"]
    assert complete("coldglow", "sky", "uranus", "--instrument", "") == instruments
    assert complete("coldglow", "compare", "x.yaml", "--instruments", "ifu-8m", "ech") == [
        "echelle-4m",
        "echelle-8m",
    ]
    assert complete("coldglow", "draft", "--target", "nep") == ["neptune"]
    assert complete("coldglow", "show", "target") == ["targets"]
    assert complete("coldglow", "completion", "") == ["bash", "zsh", "fish"]


@needs_bash
def test_bash_leaves_paths_to_itself(complete):
    assert complete("coldglow", "plan", "") == []
    assert complete("coldglow", "hours", "x.yaml", "--write", "") == []


def test_names_of_the_users_own_are_there(complete, tmp_path, monkeypatch, capsys):
    (tmp_path / "mine.yaml").write_text("format: coldglow-target/1\nextends: uranus\n", encoding="utf-8")
    assert "mine" in script(capsys, "bash")


@pytest.mark.parametrize("shell", ["bash", "zsh", "fish"])
def test_the_script_is_one_that_the_shell_can_read(capsys, tmp_path, shell):
    program = shutil.which(shell)
    if program is None:
        pytest.skip(f"no {shell} on this machine")
    path = tmp_path / f"script.{shell}"
    path.write_text(script(capsys, shell), encoding="utf-8")
    subprocess.run([program, "-n", str(path)], check=True, capture_output=True)


@pytest.mark.parametrize("shell", ["zsh", "fish"])
def test_other_shells_hold_every_command_and_name(capsys, shell):
    text = script(capsys, shell)
    for word in [*cli.COMMANDS, *names("target"), *names("instrument")]:
        assert word in text
    for name in cli.COMMANDS:
        for option in cli.syntax_of(name).options:
            assert option.name.removeprefix("--") in text


def test_an_unknown_shell_is_wrong_input(capsys):
    assert cli.main(["completion", "korn"]) == 2
    assert "bash, zsh, fish" in capsys.readouterr().err
