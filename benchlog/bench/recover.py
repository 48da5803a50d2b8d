"""Knowing who answers, at the start and after trouble, so that no late answer is taken for another.

Answers come in the order of the questions: once the identity has come, everything asked before
has come too, and the next question is answered by its own answer.
"""

from typing import Protocol

from benchlog.errors import IdentityError, LinkError, LinkLost, LinkTimeout

IDENTIFY = "*IDN?"
# Late answers that may stand before the one that was asked for.
_MOST_STALE = 8
# IEEE 488.2: maker, model, serial number, firmware.
_COMMAS = 3


class Transport(Protocol):
    """What is asked of the carrier of a link while it is being recovered."""

    address: str

    def open(self, timeout_s: float) -> None:
        """Open anew."""

    def ask(self, message: str, timeout_s: float) -> str:
        """Ask once."""
        ...

    def read(self, asked: str, timeout_s: float) -> str:
        """Read one answer more."""
        ...

    def drain(self) -> None:
        """Throw away what has arrived."""


def identify(transport: Transport, *, timeout_s: float) -> str:
    """Ask who is there, when nothing is known yet.

    Some instruments still hold an answer for whoever used them before.  An answer that has not
    the four fields of an identity is believed only when it comes twice.

    Raises:
        LinkError: Nothing answers.
    """
    answer = transport.ask(IDENTIFY, timeout_s)
    if answer.count(",") >= _COMMAS or transport.ask(IDENTIFY, timeout_s) == answer:
        return answer
    transport.drain()
    return transport.ask(IDENTIFY, timeout_s)


def recover_link(transport: Transport, identity: str, *, timeout_s: float) -> None:
    """Drain, identify, and reopen where that does not help.

    Args:
        transport: The carrier.
        identity: What the instrument answered when it was opened.
        timeout_s: How long each answer may take.

    Raises:
        LinkLost: Nothing answers after reopening either.
        IdentityError: Another instrument answers.
    """
    try:
        transport.drain()
        if _who_answers(transport, identity, timeout_s) == identity:
            return
    except LinkError:
        # The reason no longer matters: reopening is the next remedy for all of them.
        pass
    try:
        transport.open(timeout_s)
        answer = _who_answers(transport, identity, timeout_s)
    except LinkError as error:
        raise LinkLost(
            f"the instrument does not come back: {error.what}",
            where=transport.address,
            hint="check its power and its cable, then start again",
        ) from error
    if answer != identity:
        raise IdentityError(
            f"another instrument answers: {answer!r}",
            where=transport.address,
            expected=identity,
            hint="check the address and which instrument is plugged in",
        )


def _who_answers(transport: Transport, identity: str, timeout_s: float) -> str:
    """Return the identity once the instrument answers in step, else what came in its place.

    Late answers may stand before it; a second question must then be answered by the identity
    and nothing else.
    """
    answer = transport.ask(IDENTIFY, timeout_s)
    for _ in range(_MOST_STALE):
        if answer == identity:
            return transport.ask(IDENTIFY, timeout_s)
        try:
            answer = transport.read(IDENTIFY, timeout_s)
        except LinkTimeout:
            break
    return answer
