"""The grammar of replies: what is a number, what is a state, what is refused and kept."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchlog.bench.reply import (
    NumberGrammar,
    QueueEntry,
    parse_block,
    parse_done,
    parse_error,
    parse_identity,
    parse_number,
)
from benchlog.errors import ReplyError
from benchlog.records import Status


@pytest.mark.parametrize(
    ("reply", "value"),
    [
        ("273", 273.0),
        ("0.273", 0.273),
        ("2.73E+2", 273.0),
        ("+1.41421356E-02", 0.0141421356),
        (".5", 0.5),
        ("-5.", -5.0),
        ("1.0\r\n", 1.0),
        ("\x001.0\x00 ", 1.0),
    ],
)
def test_numbers_of_the_standard(reply: str, value: float) -> None:
    """NR1, NR2, NR3, and the padding that instruments add."""
    number = parse_number(reply)

    assert (number.value, number.status) == (value, Status.OK)


@pytest.mark.parametrize(
    ("reply", "status"),
    [
        ("9.9E37", Status.OVERLOAD),
        ("+9.90000000E+37", Status.OVERLOAD),
        ("-9.9E37", Status.OVERLOAD),
        ("9.91E37", Status.NOT_A_NUMBER),
        ("OVLD", Status.OVERLOAD),
        ("----", Status.NOT_A_NUMBER),
    ],
)
def test_states_are_never_numbers(reply: str, status: Status) -> None:
    """SCPI's large numbers, and the words that a driver declares."""
    rules = NumberGrammar(overload={"OVLD"}, not_a_number={"----"})

    number = parse_number(reply, rules)

    assert (number.value, number.status) == (None, status)


def test_large_number_is_legal_where_the_query_says_so() -> None:
    """A source answers 9.9E37 for a load of high impedance."""
    assert parse_number("9.9E37", NumberGrammar(states=False)).value == 9.9e37
    with pytest.raises(ReplyError):
        parse_number("1e400", NumberGrammar(states=False))


@pytest.mark.parametrize(
    "reply",
    ["", " ", "1,234", "1 234", "NaN", "nan", "inf", "1e400", "----", "OVLD", "1.0 V", "VAC",
     "+1.0E+01,VAC", "0x10", "1_000", "\u0661", "--1", "1e", "5e37", "1.0\n2.0"],
)  # fmt: skip
def test_anything_else_is_refused_and_kept(reply: str) -> None:
    """Raw text stays with the error; nothing is guessed."""
    with pytest.raises(ReplyError) as refused:
        parse_number(reply)

    assert refused.value.raw == reply


def test_unit_only_where_the_driver_says_so() -> None:
    """``1.0 V`` is a number for a driver that declares V."""
    assert parse_number("1.25 V", NumberGrammar(unit="V")).value == 1.25
    with pytest.raises(ReplyError):
        parse_number("1.25 mV", NumberGrammar(unit="V"))


@given(st.text(max_size=30))
def test_any_text_is_a_number_a_state_or_refused(text: str) -> None:
    """No other exception, and no value that is not finite."""
    try:
        number = parse_number(text)
    except ReplyError:
        return
    assert (number.value is None) == (number.status is not Status.OK)
    assert number.value is None or abs(number.value) < 9.9e36


@pytest.mark.parametrize(
    ("reply", "entry"),
    [
        ('0,"No error"', QueueEntry(number=0, text="No error")),
        ('+0,"No error"', QueueEntry(number=0, text="No error")),
        ('-113,"Undefined header"', QueueEntry(number=-113, text="Undefined header")),
        (
            '-113,"Undefined ""header"";FREK"',
            QueueEntry(number=-113, text='Undefined "header";FREK'),
        ),
        ('42,""', QueueEntry(number=42, text="")),
    ],
)
def test_error_queue_entries(reply: str, entry: QueueEntry) -> None:
    """Number and quoted text; the text may be empty."""
    assert parse_error(reply) == entry


@pytest.mark.parametrize("reply", ["", "0", "No error", '-113 "x"', '0,"open'])
def test_no_entry_is_refused(reply: str) -> None:
    """A number alone could be a reading that came late."""
    with pytest.raises(ReplyError):
        parse_error(reply)


def test_done_is_one_and_nothing_else() -> None:
    """``*OPC?``."""
    parse_done("1\n")
    parse_done("+1")
    for reply in ("0", "", "1.0", "4.2E-3"):
        with pytest.raises(ReplyError):
            parse_done(reply)


def test_identity_has_four_fields_more_or_less() -> None:
    """Missing fields are empty; a comma in the last stays."""
    assert parse_identity("Works,AC-1,0042,1.0\n") == ("Works", "AC-1", "0042", "1.0")
    assert parse_identity("Works,AC-1") == ("Works", "AC-1", "", "")
    assert parse_identity("a,b,c,d,e") == ("a", "b", "c", "d,e")
    for reply in ("", "a\tb", "x" * 300):
        with pytest.raises(ReplyError):
            parse_identity(reply)


@pytest.mark.parametrize(
    ("data", "body"),
    [
        (b"#14\x00\x01\x02\x03", b"\x00\x01\x02\x03"),
        (b"#3004abcd\n", b"abcd"),
        (b"#210ABCDEFGHIJ", b"ABCDEFGHIJ"),
        (b"#13a\nb\n", b"a\nb"),
        (b"#10", b""),
    ],
)
def test_definite_blocks(data: bytes, body: bytes) -> None:
    """Newlines inside survive; the terminator behind does not count."""
    assert parse_block(data) == body


@pytest.mark.parametrize("data", [b"", b"#", b"#0abc\n", b"#15abcd", b"#1xabc", b"abc", b"#12abc"])
def test_blocks_that_are_none(data: bytes) -> None:
    """Indefinite, short, long, or not one at all."""
    with pytest.raises(ReplyError):
        parse_block(data)
