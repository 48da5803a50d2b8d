"""What every link to an instrument shows, whatever carries it."""

from typing import Protocol


class Wire(Protocol):
    """A link to one instrument that has identified itself.

    Attributes:
        address: What was opened, for messages.
        identity: The instrument's answer to ``*IDN?``.
        dirty: True once half an exchange may be under way; nothing but ``recover`` and ``close``
            is accepted then, because the next answer could belong to the last question.
    """

    address: str
    identity: str
    dirty: bool

    def send(self, message: str) -> None:
        """Send a message that has no answer.

        Raises:
            LinkTimeout, LinkLost: The wire failed and is dirty now.
            Misuse: The wire is dirty or closed.
        """

    def ask(self, message: str, *, timeout_s: float) -> str:
        """Send a message whose last line is a query; return the answer without terminator.

        Raises:
            LinkTimeout, LinkLost: The wire failed and is dirty now.
            Misuse: The wire is dirty or closed.
        """
        ...

    def recover(self) -> None:
        """Make the wire clean: drop what is under way, prove that the same instrument answers.

        Raises:
            LinkLost: Nothing answers.
            IdentityError: Another instrument answers.
        """

    def close(self) -> None:
        """Close the wire; twice is quiet."""
