"""Reply formats against published ones.

Source:
    Numbers and blocks of IEEE 488.2 as instrument manuals quote them: NR1, NR2, NR3 (a power
    supply's programming guide, p. 19); ``#14<4 bytes>`` = ``#3004<4 bytes>`` (a modular
    system's manual, p. 131); +-9.9E37 and 9.91E37 (a monitor's SCPI help, 17.8).  The format of
    SYSTem:ERRor? and the fields of ``*IDN?`` are from memory of SCPI-99 and IEEE 488.2.
"""

import numpy as np
import pytest

from benchlog.bench.reply import parse_block, parse_error, parse_identity, parse_number
from benchlog.records import Status


@pytest.mark.parametrize(("reply", "value"), [("273", 273), ("0.273", 0.273), ("2.73E+2", 273)])
def test_number_formats(reply: str, value: float) -> None:
    """The three decimal numeric responses."""
    assert parse_number(reply).value == value


@pytest.mark.parametrize(
    ("reply", "status"),
    [
        ("9.9E37", Status.OVERLOAD),
        ("-9.9E37", Status.OVERLOAD),
        ("9.91E37", Status.NOT_A_NUMBER),
    ],
)
def test_infinities_and_not_a_number(reply: str, status: Status) -> None:
    """Finite doubles all three; states to whoever reads the standard."""
    assert np.isfinite(float(reply))
    assert parse_number(reply).status is status


def test_same_block_with_padded_length() -> None:
    """Both spellings hold the same four bytes, and a waveform's length has four digits."""
    assert parse_block(b"#14\x01\x02\x03\x04") == parse_block(b"#3004\x01\x02\x03\x04")
    waveform = np.arange(2048, dtype=np.float32).tobytes()
    assert parse_block(b"#48192" + waveform + b"\n") == waveform


def test_empty_queue_and_identity() -> None:
    """What every instrument of the standard answers."""
    assert parse_error('0,"No error"').number == 0
    assert len(parse_identity("maker,model,0,0")) == 4
