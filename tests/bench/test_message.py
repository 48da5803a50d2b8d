"""Messages: named fields, one question, and nothing that could be a program."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchlog.bench.message import Message, NumberForm, check_lines
from benchlog.errors import DriverFileError, Misuse

KNOWN = frozenset({"frequency_hz", "level"})


@pytest.mark.parametrize(
    ("value", "style", "digits", "text"),
    [
        (1000.0, "plain", 9, "1000"),
        (62500.0, "plain", 9, "62500"),
        (0.00707106781, "plain", 9, "0.00707106781"),
        (1e-7, "plain", 4, "0.0000001000"),
        (2.5e6, "plain", 6, "2500000"),
        (0.00707106781, "scientific", 6, "7.07107E-03"),
    ],
)
def test_numbers_are_written_without_locale(
    value: float, style: str, digits: int, text: str
) -> None:
    """A point, never a comma, and enough digits."""
    assert float(NumberForm(style=style, digits=digits).write(value)) == pytest.approx(value)  # type: ignore[arg-type]
    if style == "scientific" or digits == 9:
        assert NumberForm(style=style, digits=digits).write(value) == text  # type: ignore[arg-type]


@given(st.floats(min_value=1e-9, max_value=1e12))
def test_plain_numbers_carry_no_exponent(value: float) -> None:
    """Picky parsers refuse ``1e3``."""
    text = NumberForm().write(value)

    assert "e" not in text.lower()
    assert float(text) == pytest.approx(value, rel=1e-8)


def test_all_lines_travel_together() -> None:
    """One write for one action."""
    message = Message(
        lines=("FREQ {frequency_hz}", "VOLT {level}", "*OPC?"), reply="done", timeout_s=1.0
    )

    text = message.text({"frequency_hz": 1e3, "level": 0.5}, form=NumberForm())

    assert text == "FREQ 1000\nVOLT 0.5\n*OPC?"
    with pytest.raises(Misuse, match=r"no value was given for \{level\}"):
        message.text({"frequency_hz": 1e3}, form=NumberForm())


@pytest.mark.parametrize(
    ("lines", "reply", "what"),
    [
        ((), "none", "the message has no line"),
        (("FREQ {}",), "none", "has a field that is not known here"),
        (("FREQ {0}",), "none", "has a field that is not known here"),
        (("FREQ {frequency_hz.__class__}",), "none", "has a field that is not known here"),
        (("FREQ {frequency_hz!r}",), "none", "has a field that is not known here"),
        (("FREQ {load_ohm}",), "none", "has a field that is not known here"),
        (("FREQ }",), "none", "has a field that is not known here"),
        (("FREQ\n*RST",), "none", "cannot be sent"),
        (("FREQ \u03a9",), "none", "cannot be sent"),
        (("",), "none", "cannot be sent"),
        (("A" * 201,), "none", "cannot be sent"),
        (("A?", "B?"), "number", "asks more than one question"),
        (("A?;B?",), "number", "asks more than one question"),
        (("A?",), "none", "asks a question but its reply is 'none'"),
        (("A",), "number", "asks nothing but its reply is 'number'"),
    ],
)
def test_lines_that_are_no_plain_messages(lines: tuple[str, ...], reply: str, what: str) -> None:
    """Each has its own sentence and its place."""
    with pytest.raises(DriverFileError) as refused:
        check_lines(lines, known=KNOWN, reply=reply, where="here")  # type: ignore[arg-type]

    assert what in refused.value.what
    assert refused.value.where == "here"
