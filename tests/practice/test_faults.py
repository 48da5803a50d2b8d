"""Faults turn replies into what a bad day sends."""

import pytest

from benchlog.practice.faults import Fault, FaultKind, Piece, Unkindness


def spoiled(kind: FaultKind) -> tuple[Piece, ...]:
    """Return what a fault makes of the second reply."""
    unkind = Unkindness([Fault(kind=kind, nth=2, delay_s=0.5)])
    assert unkind.spoil(b"first\n") == (Piece(0.0, b"first\n"),)
    pieces = unkind.spoil(b"+1.5\n")
    assert unkind.spoil(b"third\n") == (Piece(0.0, b"third\n"),)
    return pieces


@pytest.mark.parametrize(
    ("kind", "pieces"),
    [
        ("late", (Piece(0.5, b"+1.5\n"),)),
        ("split", (Piece(0.0, b"+1"), Piece(0.5, b".5\n"))),
        ("stale", (Piece(0.0, b"first\n+1.5\n"),)),
        ("dropped", ()),
        ("closed", (Piece(0.0, None),)),
        ("overloaded", (Piece(0.0, b"+9.900000E+37\n"),)),
    ],
)
def test_each_kind(kind: FaultKind, pieces: tuple[Piece, ...]) -> None:
    """Once, at the n-th reply, and not before or after."""
    assert spoiled(kind) == pieces


def test_garbled_reply_keeps_its_length_and_end() -> None:
    """No byte of it is right, but it still ends."""
    ((_, data),) = [(piece.pause_s, piece.data) for piece in spoiled("garbled")]
    assert data is not None
    assert len(data) == 5
    assert data.endswith(b"\n")
    assert not any(a == b for a, b in zip(data[:-1], b"+1.5", strict=True))


def test_for_good_goes_on() -> None:
    """From the n-th on, all replies are struck."""
    unkind = Unkindness([Fault(kind="dropped", nth=2, for_good=True)])
    assert [len(unkind.spoil(b"x\n")) for _ in range(4)] == [1, 0, 0, 0]


def test_first_fault_has_the_reply_alone() -> None:
    """Two faults at the same reply do not pile up."""
    unkind = Unkindness([Fault(kind="dropped", nth=1), Fault(kind="closed", nth=1)])
    assert unkind.spoil(b"x\n") == ()


def test_kindness_is_the_default() -> None:
    """Without faults every reply passes."""
    assert Unkindness().spoil(b"x\n") == (Piece(0.0, b"x\n"),)
