"""Headers are found in both forms, with and without optional nodes, and in no other way."""

import pytest

from benchlog.practice.error_table import ScpiError
from benchlog.practice.tree import HeaderTree, expand, short_form, spellings

PATTERNS = [
    "[SOURce]:FREQuency[:CW|:FIXed]",
    "[SOURce]:FREQuency[:CW|:FIXed]?",
    "OUTPut[:STATe]",
    "OUTPut:LOAD",
    "SYSTem:ERRor[:NEXT]?",
    "*IDN?",
]

TREE = HeaderTree((pattern, pattern) for pattern in PATTERNS)


def test_expand_lists_every_way_to_write_a_pattern() -> None:
    """Two optional parts, one with a choice, make six ways."""
    assert sorted(expand("[SOURce]:FREQuency[:CW|:FIXed]")) == [
        ("FREQuency",),
        ("FREQuency", "CW"),
        ("FREQuency", "FIXed"),
        ("SOURce", "FREQuency"),
        ("SOURce", "FREQuency", "CW"),
        ("SOURce", "FREQuency", "FIXed"),
    ]


def test_forms_of_a_keyword() -> None:
    """Capitals are the short form; a common command has one form only."""
    assert short_form("FREQuency") == "FREQ"
    assert spellings("BANDwidth") == ("BAND", "BANDWIDTH")
    assert spellings("*IDN") == ("*IDN", "*IDN")


@pytest.mark.parametrize(
    ("header", "found"),
    [
        ("FREQ", PATTERNS[0]),
        ("FREQUENCY", PATTERNS[0]),
        ("SOUR:FREQ:CW", PATTERNS[0]),
        ("SOURCE:FREQUENCY:FIXED", PATTERNS[0]),
        ("SOURCE1:FREQ1:FIX", PATTERNS[0]),
        ("OUTP", PATTERNS[2]),
        ("OUTPUT:STAT", PATTERNS[2]),
        ("OUTP:LOAD", PATTERNS[3]),
    ],
)
def test_known_headers(header: str, found: str) -> None:
    """Short and long forms mix freely; a suffix of 1 is the same as none."""
    assert TREE.find(tuple(header.split(":")), query=False) == found


@pytest.mark.parametrize(
    ("header", "number"),
    [
        ("FREQUE", -113),
        ("FRE", -113),
        ("FREQUENCYS", -113),
        ("CW", -113),
        ("SOUR", -113),
        ("SOUR:SOUR:FREQ", -113),
        ("FREQ:CW:FIX", -113),
        ("LOAD", -113),
        ("SYST:ERR", -113),
        ("*IDN", -113),
        ("*RST", -113),
        ("OUTP2", -114),
        ("SOUR0:FREQ", -114),
    ],
)
def test_unknown_headers(header: str, number: int) -> None:
    """Nothing between the two forms is accepted, and a query is not its command."""
    with pytest.raises(ScpiError) as caught:
        TREE.find(tuple(header.split(":")), query=False)
    assert caught.value.number == number


def test_command_and_query_are_two_entries() -> None:
    """The same header may mean both."""
    assert TREE.find(("FREQ",), query=True) == PATTERNS[1]
    assert TREE.find(("SYST", "ERR"), query=True) == PATTERNS[4]
    with pytest.raises(ScpiError):
        TREE.find(("OUTP",), query=True)
