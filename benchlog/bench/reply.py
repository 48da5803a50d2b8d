"""The grammar of replies: numbers, states, the error queue, identities, blocks.

Pure functions over text and bytes; the wire is someone else's business.  A reply that does not
follow its grammar is refused and kept as it came.
"""

import math
import re
from collections.abc import Collection
from dataclasses import dataclass

from benchlog.errors import ReplyError
from benchlog.records import Status

# NR1 "273", NR2 "0.273", NR3 "2.73E+2" (IEEE 488.2).
_NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_ERROR = re.compile(r'([+-]?[0-9]+)\s*,\s*"((?:[^"]|"")*)"')
# SCPI-99 sends +/-9.9E37 for infinity and 9.91E37 for not-a-number.
INFINITY = 9.9e37
NOT_A_NUMBER = 9.91e37
_STATE_FLOOR = 9.9e36
_PADDING = "\r\n\0 \t"
_LONGEST_SHOWN = 60


@dataclass(frozen=True, slots=True, kw_only=True)
class NumberGrammar:
    """What one query may answer with a number.

    Attributes:
        unit: Unit the instrument writes behind the number; empty for none.
        overload: Words that mean that the range is exceeded, such as ``OVLD``.
        not_a_number: Words that mean that there is no reading.
        states: Whether SCPI's large numbers are states here; False where they are legal answers,
            as for the load of an output.
    """

    unit: str = ""
    overload: Collection[str] = ()
    not_a_number: Collection[str] = ()
    states: bool = True


@dataclass(frozen=True, slots=True, kw_only=True)
class Number:
    """A number, or the state that stands in its place."""

    value: float | None
    status: Status


@dataclass(frozen=True, slots=True, kw_only=True)
class QueueEntry:
    """One entry of an error queue; number 0 says that the queue is empty."""

    number: int
    text: str


def parse_number(text: str, grammar: NumberGrammar | None = None) -> Number:
    """Read exactly one number, or a state.

    Args:
        text: The reply; padding around it is ignored.
        grammar: What this query may answer.

    Raises:
        ReplyError: Anything else; ``raw`` holds the reply.

    Source:
        IEEE 488.2 numeric response data; SCPI-99 for the states.
    """
    rules = grammar or NumberGrammar()
    body = text.strip(_PADDING)
    if body in rules.overload:
        return Number(value=None, status=Status.OVERLOAD)
    if body in rules.not_a_number:
        return Number(value=None, status=Status.NOT_A_NUMBER)
    if rules.unit and body.endswith(rules.unit):
        body = body.removesuffix(rules.unit).rstrip()
    if not (body.isascii() and _NUMBER.fullmatch(body)):
        raise _refused(text, "one number")
    value = float(body)
    if rules.states and abs(value) >= _STATE_FLOOR:
        return _state(value, text)
    if not math.isfinite(value):
        raise _refused(text, "a finite number")
    return Number(value=value, status=Status.OK)


def _state(value: float, text: str) -> Number:
    """Tell SCPI's states apart; a huge number that is none of them is refused."""
    if math.isclose(value, NOT_A_NUMBER, rel_tol=1e-4):
        return Number(value=None, status=Status.NOT_A_NUMBER)
    if math.isclose(abs(value), INFINITY, rel_tol=1e-4):
        return Number(value=None, status=Status.OVERLOAD)
    raise _refused(text, "a number, or 9.9E37 (overload) or 9.91E37 (not a number)")


def parse_done(text: str) -> None:
    """Read the answer of ``*OPC?``, which is 1 and nothing else (IEEE 488.2).

    Raises:
        ReplyError: Anything else.
    """
    if text.strip(_PADDING).lstrip("+") != "1":
        raise _refused(text, '"1", the answer of *OPC?')


def parse_error(text: str) -> QueueEntry:
    """Read one entry of the error queue: ``-113,"Undefined header"`` (SCPI-99, SYSTem:ERRor?).

    Raises:
        ReplyError: Anything else.
    """
    found = _ERROR.fullmatch(text.strip(_PADDING))
    if not found:
        raise _refused(text, 'a number and a quoted text, like 0,"No error"')
    return QueueEntry(number=int(found[1]), text=found[2].replace('""', '"'))


def parse_identity(text: str) -> tuple[str, str, str, str]:
    """Read the answer of ``*IDN?``: maker, model, serial, firmware.

    Fields that are missing come back empty; the standard asks for four, not all instruments
    listen.

    Raises:
        ReplyError: Empty, not printable, or longer than an identity can be.
    """
    body = text.strip(_PADDING)
    if not body or len(body) > 256 or not body.isprintable():
        raise _refused(text, "an identity: maker,model,serial,firmware")
    fields = [field.strip() for field in body.split(",", 3)]
    maker, model, serial, firmware = (fields + [""] * 4)[:4]
    return maker, model, serial, firmware


def parse_block(data: bytes) -> bytes:
    """Read a definite-length block: ``#``, digits of the length, the length, that many bytes.

    Args:
        data: The whole reply, with or without its terminator.

    Returns:
        The bytes of the block, terminator characters inside it kept.

    Raises:
        ReplyError: No block, an indefinite one, or fewer bytes than announced.

    Source:
        IEEE 488.2 definite-length arbitrary block response data.
    """
    head = data[:2]
    if len(head) < 2 or head[:1] != b"#" or not head[1:].isdigit() or head == b"#0":
        raise _refused(data[:20].decode("latin-1"), "a definite-length block, like #14<4 bytes>")
    digits = int(head[1:])
    length_text = data[2 : 2 + digits]
    if len(length_text) < digits or not length_text.isdigit():
        raise _refused(data[:20].decode("latin-1"), f"{digits} digits of length after {head!r}")
    length = int(length_text)
    body = data[2 + digits :]
    if len(body) < length or body[length:].strip(b"\r\n"):
        raise _refused(data[:20].decode("latin-1"), f"{length} bytes, not {len(body)}")
    return body[:length]


def _refused(text: str, expected: str) -> ReplyError:
    shown = repr(text)
    if len(shown) > _LONGEST_SHOWN:
        shown = shown[:_LONGEST_SHOWN] + "..."
    return ReplyError(f"the reply {shown} is refused", expected=expected, raw=text)
