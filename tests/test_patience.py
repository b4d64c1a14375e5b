"""Signs of life: on a terminal after some time, nowhere else."""

import io
import time

import pytest

from coldglow import cli, patience


class Terminal(io.StringIO):
    """A stream that says it is a terminal."""

    def isatty(self):
        return True


def on_terminal(monkeypatch, patience_s=0.05):
    """Make standard error a terminal; in the test itself, since pytest sets it anew before each."""
    stream = Terminal()
    monkeypatch.setattr("sys.stderr", stream)
    monkeypatch.setattr(patience, "PATIENCE_S", patience_s)
    return stream


def test_quick_work_says_nothing(monkeypatch):
    terminal = on_terminal(monkeypatch, 30.0)
    with patience.waiting("hours"):
        pass
    assert terminal.getvalue() == ""


def test_long_work_shows_that_it_goes_on(monkeypatch):
    terminal = on_terminal(monkeypatch)
    with patience.waiting("hours"):
        time.sleep(0.4)
    assert "hours: working" in terminal.getvalue()
    before = terminal.getvalue()
    time.sleep(0.2)
    assert terminal.getvalue() == before


def test_it_ends_with_an_error_too(monkeypatch):
    terminal = on_terminal(monkeypatch)

    def broken():
        with patience.waiting("hours"):
            time.sleep(0.2)
            raise ZeroDivisionError

    with pytest.raises(ZeroDivisionError):
        broken()
    before = terminal.getvalue()
    time.sleep(0.2)
    assert terminal.getvalue() == before


def test_steps_are_told_on_a_terminal_only(monkeypatch):
    terminal = on_terminal(monkeypatch)
    patience.teller("plan")("figures")
    assert terminal.getvalue() == "plan: figures\n"
    quiet = io.StringIO()
    monkeypatch.setattr("sys.stderr", quiet)
    patience.teller("plan")("figures")
    with patience.waiting("hours"):
        time.sleep(0.1)
    assert quiet.getvalue() == ""


def test_the_command_line_waits_in_company(capsys, monkeypatch):
    terminal = on_terminal(monkeypatch)

    def slow(words):
        time.sleep(0.3)
        return "done\n"

    command = cli.COMMANDS["show"]
    monkeypatch.setitem(
        cli.COMMANDS, "show", cli.Command(command.question, command.example, "", command.add, slow)
    )
    assert cli.main(["show"]) == 0
    assert "show: working" in terminal.getvalue()
