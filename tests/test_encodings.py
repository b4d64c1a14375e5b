"""What a terminal's encoding lacks is printed in plain characters of the same meaning."""

import io
import unicodedata

import pytest

from coldglow.encodings import allow_any_encoding, plain_character


def printed(text, encoding):
    """Return what a stream of that encoding gets."""
    raw = io.BytesIO()
    stream = io.TextIOWrapper(raw, encoding=encoding)
    allow_any_encoding(stream)
    stream.write(text)
    stream.flush()
    return raw.getvalue().decode(encoding)


def test_nothing_changes_where_the_encoding_has_all():
    text = "0.75″ at 0.5 µm, 3 ± 1 km s⁻¹, 12°, 2 σ, ∞ ─ H₃⁺"
    assert printed(text, "utf-8") == text


def test_only_what_is_lacking_changes():
    assert printed("0.75″ at 0.5 µm, 3 ± 1 km s⁻¹, 12°", "iso-8859-9") == '0.75" at 0.5 µm, 3 ± 1 km s-¹, 12°'
    assert printed("0.75″ at 0.5 µm, 3 ± 1 km s⁻¹, 12°", "ascii") == '0.75" at 0.5 um, 3 +- 1 km s-1, 12deg'


@pytest.mark.parametrize(
    ("character", "plain"),
    [
        ("σ", "sigma"),
        ("₃", "3"),
        ("⁹", "9"),
        ("é", "e"),
        ("…", "..."),
        ("漢", "?"),
        ("\udc80", "?"),
        ("≤", "<="),
    ],
)
def test_a_character_in_plain_letters(character, plain):
    assert plain_character(character) == plain


def test_every_character_has_a_plain_form_in_ascii():
    for code in range(0x80, 0x3000):
        plain = plain_character(chr(code))
        assert plain
        assert plain.isascii(), unicodedata.name(chr(code))


def test_a_stream_that_cannot_be_set_is_left_alone():
    stream = io.StringIO()
    allow_any_encoding(stream)
    stream.write("″")
    assert stream.getvalue() == "″"


def test_what_cannot_be_read_is_still_an_error():
    allow_any_encoding()
    with pytest.raises(UnicodeDecodeError):
        b"\xff".decode("utf-8", "coldglow-plain")
