from __future__ import annotations

import csv
import html.parser
import json

import numpy as np
import pytest
from astropy import units
from astropy.table import QTable
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as arrays

from coldglow.errors import OutputError
from coldglow.report.files import csv_text, ecsv_text, json_text
from coldglow.report.reading import read_result
from coldglow.report.results import Column, Entry, Result, Table, column, table


def example(rows: int = 5) -> Result:
    index = np.arange(rows)
    main = table(
        column("night", [f"2027-11-{1 + i % 28:02d}" for i in index]),
        column("duration", 1.0 + index / 3.0, "h", decimals=2, description="length of the stretch"),
        column("range_rate", -30.0 + index, "km s-1", decimals=1),
        column("radiance", 1.234567e-8 * 10.0**index, "W m-2 sr-1"),
        column(
            "time_to_goal",
            np.where(index % 2, np.inf, np.where(index % 4, np.nan, 2.5)),
            "h",
            infinite="never",
        ),
        column("observable", index % 2 == 0),
        column("rank", index + 1),
        column("note", ["" if i else 'a, "b" & <c> é' for i in index]),
        caption="Best stretches",
    )
    second = table(column("longitude", [15.0, 45.0], "deg"), column("visits", [1, 0]), caption="Bins")
    header = {
        "temperature": Entry(480.0, "K", random_error=12.3, systematic_error=15.0),
        "column": Entry(1.23456789e15, "m-2"),
        "never": Entry(np.inf, "h"),
        "unknown": Entry(np.nan, "h"),
        "setting": Entry("l_band"),
        "coadds": Entry(12),
        "daytime": Entry(False, label="Daytime allowed"),
    }
    return Result(
        "hours",
        {"hours": main, "bins": second},
        header,
        ["Feasible: three nights reach SNR 5."],
        ["The line list ends at 5.5 µm."],
    )


def same_column(one: Column, other: Column) -> None:
    np.testing.assert_array_equal(one.values, other.values)
    assert one.values.dtype.kind == other.values.dtype.kind
    assert (one.name, one.unit, one.description) == (other.name, other.unit, other.description)


@pytest.mark.parametrize("extension", ["json", "ecsv"])
def test_round_trip_keeps_every_bit(tmp_path, extension):
    result = example()
    back = read_result(result.write(tmp_path / f"hours.{extension}"))
    assert (back.command, back.feasible) == (result.command, result.feasible)
    assert list(back.sentences) == list(result.sentences)
    assert list(back.warnings) == list(result.warnings)
    names = list(result.tables) if extension == "json" else ["hours"]
    assert list(back.tables) == names
    for name in names:
        assert back.tables[name].caption == result.tables[name].caption
        for one, other in zip(result.tables[name].columns, back.tables[name].columns, strict=True):
            same_column(one, other)
    assert set(back.header) == set(result.header)
    for key, entry in result.header.items():
        stored = back.header[key]
        np.testing.assert_equal(stored.value, entry.value)
        assert (stored.unit, str(stored), stored.label) == (entry.unit, str(entry), entry.label)
        assert (stored.random_error, stored.systematic_error) == (entry.random_error, entry.systematic_error)
    # written again, it is the same file
    again = back.write(tmp_path / f"again.{extension}")
    assert again.read_bytes() == (tmp_path / f"hours.{extension}").read_bytes()


@settings(max_examples=60, deadline=None)
@given(
    values=arrays.arrays(np.float64, st.integers(0, 6), elements=st.floats(width=64)),
    texts=st.lists(st.text(st.characters(exclude_categories=("Cs", "Cc")), max_size=8), max_size=6),
)
def test_any_numbers_and_texts_survive_json(tmp_path_factory, values, texts):
    tables = {
        "x": table(column("value", values, "K")),
        "y": Table((Column("text", np.array(texts, np.str_)),)),
    }
    path = tmp_path_factory.mktemp("json") / "any.json"
    back = read_result(Result("any", tables).write(path))
    np.testing.assert_array_equal(back.table("x")["value"], values)
    assert back.table("y")["text"].tolist() == [text.rstrip("\0") for text in texts]


def test_json_is_strict_and_gives_each_quantity_its_unit():
    def refuse(name: str) -> None:
        raise AssertionError(f"{name} is not JSON")

    content = json.loads(json_text(example()), parse_constant=refuse)
    assert content["header"]["temperature"]["unit"] == "K"
    assert content["header"]["never"]["value"] == "infinity"
    columns = content["tables"]["hours"]["columns"]
    assert columns["range_rate"]["unit"] == "km s-1"
    assert columns["time_to_goal"]["values"] == [2.5, "infinity", None, "infinity", 2.5]


def test_ecsv_is_read_by_astropy_with_units_and_header(tmp_path):
    path = example().write(tmp_path / "hours.ecsv")
    content = QTable.read(path, format="ascii.ecsv")
    assert content["range_rate"].unit == units.km / units.s
    assert content["duration"].info.description == "length of the stretch"
    assert content.meta["coldglow"]["header"]["temperature"]["value"] == 480.0
    np.testing.assert_array_equal(content["radiance"].value, example()["radiance"])


def test_qtable_has_the_units_of_the_columns():
    quantities = example().qtable()
    assert quantities["radiance"].unit == units.W / units.m**2 / units.sr
    assert quantities["radiance"][1].to_value("erg s-1 cm-2 sr-1") == pytest.approx(1.234567e-4)
    assert quantities["observable"].dtype == bool
    assert example().qtable("bins")["longitude"].unit == units.deg


def test_csv_is_names_then_values_in_full():
    rows = list(csv.DictReader(csv_text(example()).splitlines()))
    result = example()
    assert list(rows[0]) == [part.name for part in result.table().columns]
    np.testing.assert_array_equal([float(row["radiance"]) for row in rows], result["radiance"])
    np.testing.assert_array_equal([float(row["time_to_goal"]) for row in rows], result["time_to_goal"])
    assert rows[0]["note"] == 'a, "b" & <c> é'


def test_tex_table_is_escaped_and_complete(tmp_path):
    text = example().write(tmp_path / "hours.tex").read_text(encoding="utf-8")
    assert r"\& \textless{}c\textgreater{}" in text
    assert r"$1.234567\times10^{-8}$" in text
    assert r"W m$^{-2}$ sr$^{-1}$" in text
    assert text.count(r"\\") == 5 + 2
    assert r"\infty" in text


def test_another_table_can_be_written(tmp_path):
    assert "longitude" in example().write(tmp_path / "bins.csv", "bins").read_text().splitlines()[0]
    with pytest.raises(KeyError, match="there are hours, bins"):
        example().write(tmp_path / "x.csv", "binz")


@pytest.mark.parametrize("name", ["hours", "hours.txt", "hours.ECSV.gz"])
def test_an_unknown_extension_is_refused(tmp_path, name):
    with pytest.raises(OutputError, match=r"use one of \.ecsv, \.csv, \.json, \.tex"):
        example().write(tmp_path / name)
    assert list(tmp_path.iterdir()) == []


def test_a_missing_folder_is_an_output_error(tmp_path):
    with pytest.raises(OutputError, match="No such file or directory"):
        example().write(tmp_path / "none" / "hours.json")


def test_a_failing_write_leaves_the_old_file_and_nothing_else(tmp_path, monkeypatch):
    path = tmp_path / "hours.json"
    path.write_text("old")

    def fail(*_: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr("os.replace", fail)
    with pytest.raises(KeyboardInterrupt):
        example().write(path)
    assert path.read_text() == "old"
    assert [file.name for file in tmp_path.iterdir()] == ["hours.json"]


@pytest.mark.parametrize(
    ("name", "text", "match"),
    [
        ("x.json", "{}", "not a result"),
        ("x.json", "[1", "not a result"),
        ("x.json", '{"format": "coldglow-result/9"}', "coldglow-result/9"),
        ("x.ecsv", "# %ECSV 1.0\n# ---\n# datatype:\n# - {name: a, datatype: int64}\na\n1\n", "not a result"),
        ("x.csv", "a\n1\n", r"only \.json and \.ecsv"),
    ],
)
def test_reading_what_is_no_result_says_so(tmp_path, name, text, match):
    (tmp_path / name).write_text(text)
    with pytest.raises(OutputError, match=match):
        read_result(tmp_path / name)


def test_reading_a_missing_file_says_so(tmp_path):
    with pytest.raises(OutputError, match="No such file"):
        read_result(tmp_path / "none.json")


def test_printed_text_keeps_to_a_hundred_columns_and_says_what_it_leaves_out():
    text = str(example(144))
    assert max(map(len, text.splitlines())) <= 100
    assert "(40 of 144 rows" in text
    assert "480 ± 12 K (random), ± 15 K (systematic)" in text
    assert "! The line list ends at 5.5 µm." in text
    assert "never" in text
    assert "km s⁻¹" in text


def test_wide_tables_repeat_their_first_column():
    wide = Table(tuple(column(f"quantity_number_{i}", np.arange(3) + 1000.0 * i) for i in range(25)))
    lines = str(Result("wide", {"wide": wide})).splitlines()
    assert max(map(len, lines)) <= 100
    assert sum(line.split()[:1] == ["0"] for line in lines) == text_panels(lines) > 1


def text_panels(lines: list[str]) -> int:
    return sum(set(line) <= {"─", " "} and "─" in line for line in lines)


def test_chosen_rows_and_hidden_columns():
    chosen = table(column("a", [1, 2, 3]), column("b", [4, 5, 6], shown=False), rows=[2, 0])
    text = str(Result("x", {"x": chosen}))
    assert [line.strip() for line in text.splitlines()[2:4]] == ["3", "1"]
    assert "b" not in text.splitlines()[0]
    assert "b" in csv_text(Result("x", {"x": chosen})).splitlines()[0]


def test_a_table_for_files_only_is_not_printed():
    kept = table(column("a", [1, 2]), caption="Files", rows=[])
    result = Result("x", {"files": kept})
    assert str(result) == ""
    assert "<table>" not in result._repr_html_()
    assert csv_text(result) == "a\n1\n2\n"


def test_an_empty_table_prints_and_is_stored(tmp_path):
    result = Result("x", {"x": table(column("a", np.array([]), "K"))}, feasible=False)
    assert str(result) == ""
    assert len(read_result(result.write(tmp_path / "x.ecsv")).table()) == 0
    assert read_result(result.write(tmp_path / "x.json")).feasible is False


def test_notebook_form_is_escaped_html():
    class Cells(html.parser.HTMLParser):
        tags: list[str] = []  # noqa: RUF012
        texts: list[str] = []  # noqa: RUF012

        def handle_starttag(self, tag, attrs):
            self.tags.append(tag)

        def handle_data(self, data):
            self.texts.append(data)

    parser = Cells()
    parser.feed(example()._repr_html_())
    assert 'a, "b" & <c> é' in parser.texts
    assert "c" not in parser.tags
    assert {"table", "th", "td", "caption", "thead"} <= set(parser.tags)


def test_columns_and_tables_refuse_what_cannot_be():
    with pytest.raises(ValueError, match="one dimension"):
        column("a", [[1, 2]])
    with pytest.raises(ValueError, match="differ in length"):
        table(column("a", [1]), column("b", [1, 2]))
    with pytest.raises(ValueError, match="same name"):
        table(column("a", [1]), column("a", [1]))
    with pytest.raises(KeyError, match="there are night"):
        example().table().column("nights")


def test_the_same_result_gives_the_same_bytes():
    for text in (ecsv_text, csv_text):
        assert text(example()) == text(example())
    assert json_text(example()) == json_text(example())
