"""Random edits of valid files: every outcome is a record or a list of problems with file and line."""

import os
import tempfile
from pathlib import Path

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from coldglow.describe.load import load_any
from coldglow.describe.records import Instrument, Request, Target
from coldglow.errors import DescriptionError, NotFoundError

FOLDERS = [Path(__file__).parents[2] / name for name in ("targets", "instruments", "examples")]
FILES = {path.name: path.read_text(encoding="utf-8") for folder in FOLDERS for path in folder.glob("*.yaml")}

ODD = (
    "|nan|inf|-1|0|1e308 K|1e-308 m|none|~"
    "|[]|{}|[1, 2]|{a: 1}|yes|2027-13-45|٣ K|５００ K|\x00|!!int 3|*a|&a b|'"
    '|"|0x10 m|-0:0:0|99:99:99|%|1 %%|e-|../../etc|2027-01-01 to 2027-01-01|- - -'
    "|٠|½ m|−5 K|1\u00a0K|1\u200bK"
)
odd = st.sampled_from([*ODD.split("|"), "9" * 400, "1 000 000 000 nights"])


def outcome(text):
    """Return the record, or the problems in words."""
    handle, name = tempfile.mkstemp(suffix=".yaml")
    os.close(handle)
    path = Path(name)
    try:
        path.write_text(text, encoding="utf-8")
        return load_any(path)
    except DescriptionError as refused:
        return [problem for problem in refused.problems if problem.line >= 1 and problem.what]
    except NotFoundError as refused:
        return str(refused)
    finally:
        path.unlink()


relaxed = settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.too_slow])


@relaxed
@given(st.sampled_from(sorted(FILES)), st.data())
def test_a_line_with_another_value(name, data):
    lines = FILES[name].splitlines()
    index = data.draw(st.integers(0, len(lines) - 1))
    key = lines[index].partition(":")[0]
    lines[index] = f"{key}: {data.draw(odd | st.text(max_size=10))}"
    assert outcome("\n".join(lines))


@relaxed
@given(st.sampled_from(sorted(FILES)), st.data())
def test_a_line_left_out_or_twice_or_moved(name, data):
    lines = FILES[name].splitlines()
    line = lines.pop(data.draw(st.integers(0, len(lines) - 1)))
    for _ in range(data.draw(st.integers(0, 2))):
        lines.insert(data.draw(st.integers(0, len(lines))), line)
    assert outcome("\n".join(lines))


@relaxed
@given(st.sampled_from(sorted(FILES)), st.data())
def test_characters_replaced(name, data):
    text = FILES[name]
    for _ in range(data.draw(st.integers(1, 4))):
        at = data.draw(st.integers(0, len(text) - 1))
        text = text[:at] + data.draw(st.text(max_size=3)) + text[at + data.draw(st.integers(0, 3)) :]
    assert outcome(text)


def test_the_files_themselves_are_right():
    for text in FILES.values():
        assert isinstance(outcome(text), Target | Instrument | Request)
