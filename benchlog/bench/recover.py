"""Making a dirty link clean again, so that no late answer is taken for another."""

from typing import Protocol

from benchlog.errors import IdentityError, LinkError, LinkLost, LinkTimeout

IDENTIFY = "*IDN?"
# Late answers that may stand before the one that was asked for.
_MOST_STALE = 8


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


def recover_link(transport: Transport, identity: str, *, timeout_s: float) -> None:
    """Drain, identify, and reopen where that does not help.

    Answers come in the order of the questions, so once the identity has come, everything asked
    before has come too; a second identification must then be answered at once by the identity
    and nothing else.

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
        if _is_back(transport, identity, timeout_s):
            return
    except LinkError:
        # The reason no longer matters: reopening is the next remedy for all of them.
        pass
    try:
        transport.open(timeout_s)
        answer = transport.ask(IDENTIFY, timeout_s)
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


def _is_back(transport: Transport, identity: str, timeout_s: float) -> bool:
    """Tell whether the instrument answers in step again."""
    answer = transport.ask(IDENTIFY, timeout_s)
    stale = 0
    while answer != identity:
        stale += 1
        if stale > _MOST_STALE:
            return False
        try:
            answer = transport.read(IDENTIFY, timeout_s)
        except LinkTimeout:
            return False
    return transport.ask(IDENTIFY, timeout_s) == identity
