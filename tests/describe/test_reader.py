"""The reader: every leaf a text, every key path with its line, hostile files refused in bounded time."""

import os
import time

import pytest
import yaml
from hypothesis import given
from hypothesis import strategies as st

from coldglow.describe import reader
from coldglow.describe.reader import read_tree
from coldglow.errors import DescriptionError, NotFoundError


def tree_of(text):
    return reader.parse_tree(text.encode(), "x.yaml")


def test_nothing_is_guessed():
    tree = tree_of("a: NO\nb: 1e5\nc: -30:14:16\nd: 2027-01-01\ne: ~\nf: 'quoted'\ng: 0o17\nh: null\n")
    assert list(tree.data.values()) == ["NO", "1e5", "-30:14:16", "2027-01-01", "~", "quoted", "0o17", "null"]


def test_each_key_path_has_its_line():
    tree = tree_of("a:\n  b: 1\n  c:\n    - x\n    - {d: 2,\n       e: 3}\n")
    lines = {key: line for key, (_, line) in tree.lines.items()}
    assert lines == {"": 1, "a": 1, "a.b": 2, "a.c": 3, "a.c.0": 4, "a.c.1": 5, "a.c.1.d": 5, "a.c.1.e": 6}


def test_a_path_that_was_not_written_is_located_at_what_encloses_it():
    tree = tree_of("a:\n  b: 1\n")
    assert tree.locate("a.b.c") == ("x.yaml", 2)
    assert tree.locate("a.z") == ("x.yaml", 1)
    assert tree.locate("nowhere") == ("x.yaml", 1)


def test_a_branch_keeps_its_lines():
    branch = tree_of("a:\n  - b:\n      c: 1\n").branch("a.0.b")
    assert branch.data == {"c": "1"}
    assert branch.lines == {"c": ("x.yaml", 3), "": ("x.yaml", 2)}


def test_a_byte_order_mark_and_windows_line_ends_are_harmless():
    assert reader.parse_tree(b"\xef\xbb\xbfa: 1\r\nb: 2\r\n", "x").data == {"a": "1", "b": "2"}


def test_all_mistakes_of_form_at_once():
    with pytest.raises(DescriptionError) as raised:
        tree_of("a: 1\na: 2\nb: &x 1\nc: *x\nd: !t 1\nb: 3\n")
    assert [problem.line for problem in raised.value.problems] == [2, 3, 4, 5, 6]


def test_a_file_above_one_megabyte_is_refused(tmp_path):
    path = tmp_path / "large.yaml"
    path.write_bytes(b"a: 1 # " + b"x" * reader.LARGEST_BYTES)
    with pytest.raises(DescriptionError, match="larger than 1 MB"):
        read_tree(path)
    path.write_bytes(b"a: 1 #".ljust(reader.LARGEST_BYTES, b"x"))
    assert read_tree(path).data == {"a": "1"}


def test_a_file_that_is_not_there(tmp_path):
    with pytest.raises(NotFoundError, match="cannot be read"):
        read_tree(tmp_path / "none.yaml")
    with pytest.raises(NotFoundError, match="cannot be read"):
        read_tree(tmp_path)


@pytest.mark.parametrize(
    "text",
    [
        "a: " + "[" * 400_000,
        "a: " + "{b: " * 200_000,
        "".join(f"{' ' * n}k:\n" for n in range(1000)),
        "\n".join(f"k{n}: {n}" for n in range(80_000)) + "\nk0: again",
        "\n".join("k: 1" for _ in range(200_000)),
        "a: &x [1]\nb: [" + "*x, " * 200_000 + "]",
        '"' + "k" * 900_000 + '": 1',
        "? " * 300_000,
        "- " * 300_000,
    ],
    ids=["brackets", "braces", "indents", "keys", "duplicates", "aliases", "key", "questions", "dashes"],
)
def test_hostile_files_end_soon_with_a_bounded_list_of_problems(text):
    started = time.perf_counter()
    with pytest.raises(DescriptionError) as raised:
        tree_of(text)
    assert len(raised.value.problems) <= reader.MOST_PROBLEMS + 1
    assert len(str(raised.value)) < 100_000
    assert time.perf_counter() - started < 20  # two orders of magnitude above what it takes


texts = st.text(st.characters(codec="utf-8", exclude_categories=["C"]), max_size=20)
keys = st.from_regex(r"[a-z][a-z0-9_ ]{0,10}[a-z]", fullmatch=True)
nodes = st.recursive(
    texts, lambda inner: st.lists(inner, max_size=3) | st.dictionaries(keys, inner, max_size=3), max_leaves=8
)


@given(st.dictionaries(keys, nodes, min_size=1, max_size=4))
def test_what_yaml_writes_is_read_back(data):
    text = yaml.safe_dump(data, allow_unicode=True, sort_keys=False)
    if "!!" not in text:
        assert tree_of(text).data == data


@given(st.binary(max_size=300))
def test_any_bytes_give_a_tree_or_problems(content):
    try:
        tree = reader.parse_tree(content, "x.yaml")
    except DescriptionError as refused:
        lines = [problem.line for problem in refused.problems]
    else:
        lines = [line for _, line in tree.lines.values()]
    assert lines
    assert 1 <= min(lines) <= max(lines) <= content.count(b"\n") + content.count(b"\r") + 400


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="this system has no named pipes")
def test_a_pipe_is_refused_before_it_is_emptied(tmp_path):
    pipe = tmp_path / "request.yaml"
    os.mkfifo(pipe)
    with pytest.raises(NotFoundError, match="save the description as a file first"):
        read_tree(pipe)
