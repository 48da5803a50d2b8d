"""Program messages are read by the grammar of IEEE 488.2."""

import pytest

from benchlog.practice.error_table import ScpiError
from benchlog.practice.message import Element, Unit, parse_unit, split_units


def unit(text: str) -> Unit:
    """Return a unit that must be there."""
    parsed = parse_unit(text)
    assert parsed is not None
    return parsed


@pytest.mark.parametrize(
    ("message", "units"),
    [
        ("A;B", ["A", "B"]),
        ("A;", ["A", ""]),
        ("", [""]),
        ("F 'a;b';C", ["F 'a;b'", "C"]),
        ('F "a"";b";C', ['F "a"";b"', "C"]),
        ("F #13a;b;C", ["F #13a;b", "C"]),
        ("F #H1F;C", ["F #H1F", "C"]),
        ("F #;C", ["F #", "C"]),
        ("A\r", ["A "]),
    ],
)
def test_units_are_split_outside_of_strings_and_blocks(message: str, units: list[str]) -> None:
    """A semicolon inside a string or a block separates nothing; control codes are blanks."""
    assert list(split_units(message)) == units


@pytest.mark.parametrize(
    ("text", "mnemonics", "rooted", "query"),
    [
        ("FREQ", ("FREQ",), False, False),
        (" freq? ", ("FREQ",), False, True),
        (":SOUR:Freq:cw?", ("SOUR", "FREQ", "CW"), True, True),
        ("*idn?", ("*IDN",), False, True),
        ("OUTP1", ("OUTP1",), False, False),
    ],
)
def test_headers(text: str, mnemonics: tuple[str, ...], *, rooted: bool, query: bool) -> None:
    """Letter case does not matter; a leading colon and the question mark are noted."""
    parsed = unit(text)
    assert (parsed.mnemonics, parsed.rooted, parsed.query) == (mnemonics, rooted, query)


def test_nothing_but_blanks_is_no_unit() -> None:
    """Empty units are passed over, such as the one after a last semicolon."""
    assert parse_unit("  \t ") is None


@pytest.mark.parametrize(
    ("text", "kind", "value", "suffix"),
    [
        ("F 1", "number", "1E0", ""),
        ("F +.5", "number", "+.5E0", ""),
        ("F -1.", "number", "-1.E0", ""),
        ("F 1e3", "number", "1E3", ""),
        ("F 1 E -3", "number", "1E-3", ""),
        ("F 1 kHz", "number", "1E0", "KHZ"),
        ("F 2E-2Vpp", "number", "2E-2", "VPP"),
        ("F 3 V/s", "number", "3E0", "V/S"),
        ("F #HfF", "number", "255", ""),
        ("F max", "word", "MAX", ""),
        ("F 'it''s'", "string", "it's", ""),
        ('F "VOLT:AC"', "string", "VOLT:AC", ""),
        ("F #15a;b,c", "block", "#15a;b,c", ""),
        ("F (@1)", "expression", "(@1)", ""),
    ],
)
def test_data_elements(text: str, kind: str, value: str, suffix: str) -> None:
    """Every kind of data element is told from the others."""
    (element,) = unit(text).elements
    assert (element.kind, element.text, element.suffix) == (kind, value, suffix)


def test_elements_are_separated_by_commas() -> None:
    """Blanks around commas do not matter."""
    assert unit("CONF:VOLT:AC 1 V , MAX,'x'").elements == (
        Element(kind="number", text="1E0", suffix="V"),
        Element(kind="word", text="MAX"),
        Element(kind="string", text="x"),
    )


@pytest.mark.parametrize(
    ("text", "number"),
    [
        ("FREQ 1µ", -101),
        ("FREQ$", -101),
        ("123", -102),
        ("?", -102),
        ("*:RST", -102),
        ("*A:B", -102),
        (":*RST", -102),
        ("FREQ ,", -102),
        ("FREQ 1,", -102),
        ("FREQ 1,,2", -102),
        ("FREQ ?", -102),
        ("FREQ 1 2", -103),
        ("FREQ ON OFF", -103),
        ("FREQ 'a' 'b'", -103),
        ("FREQ,1", -111),
        ('FREQ"x"', -111),
        ("ABCDEFGHIJKLM 1", -112),
        ("FREQ 1.2.3", -121),
        ("FREQ +", -121),
        ("FREQ 1;", -121),
        ("FREQ 1E32001", -123),
        ("FREQ 1E999999999", -123),
        ("FREQ " + "9" * 256, -124),
        ("FREQ 1 ABCDEFGHIJKLM", -134),
        ("FREQ ON!", -141),
        ("FREQ ABCDEFGHIJKLM", -144),
        ("FREQ #", -161),
        ("FREQ #0", -161),
        ("FREQ #3", -161),
        ("FREQ #19ab", -161),
        ("FREQ (1", -171),
    ],
)
def test_broken_grammar_has_the_standards_number(text: str, number: int) -> None:
    """What the number is for is the standard's; which of two it is may be the parser's choice."""
    with pytest.raises(ScpiError) as caught:
        parse_unit(text)
    assert caught.value.number == number


@pytest.mark.parametrize("message", ["F 'a", 'F "a', "F 'a\""])
def test_open_string_is_invalid_string_data(message: str) -> None:
    """A string that is not closed swallows the rest of the message."""
    with pytest.raises(ScpiError) as caught:
        list(split_units(message))
    assert caught.value.number == -151


def test_limits_of_length_themselves_are_allowed() -> None:
    """Twelve letters, 255 digits and an exponent of 32000 are inside (same transcription)."""
    assert unit("ABCDEFGHIJKL 1").mnemonics == ("ABCDEFGHIJKL",)
    assert unit("F ABCDEFGHIJKL").elements[0].text == "ABCDEFGHIJKL"
    assert unit("F 000" + "9" * 255).elements
    assert unit("F 1E32000").elements[0].text == "1E32000"
