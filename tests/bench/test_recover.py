"""Who answers, at the start and after trouble: late answers are never taken for another's."""

from collections import deque

import pytest

from benchlog.bench.recover import identify, recover_link
from benchlog.errors import IdentityError, LinkLost, LinkTimeout

IDENTITY = "Invented Works,AC-1,0042,1.0"
OTHER = "Invented Works,AC-1,0043,1.0"


class Carrier:
    """A link with an instrument that answers in order, behind what is still under way.

    Attributes:
        held: Answers that stand before those to new questions.
        drained: Answers of ``held`` that draining catches; the others come later.
        opened: What is held once the link is opened anew; None when opening fails.
        did: What was done to it.
    """

    address = "somewhere"

    def __init__(
        self,
        held: list[str],
        *,
        drained: int = 0,
        says: str | None = IDENTITY,
        opened: list[str] | None = None,
    ) -> None:
        self.held = deque(held)
        self.drained, self.says, self.opened = drained, says, opened
        self.did: list[str] = []

    def open(self, timeout_s: float) -> None:
        """Open anew: what the instrument holds is another matter."""
        self.did.append("open")
        if self.opened is None:
            raise LinkLost(f"nothing there within {timeout_s:g} s")
        self.held = deque(self.opened)

    def ask(self, message: str, timeout_s: float) -> str:
        """Ask; the answer queues up behind the others."""
        assert message == "*IDN?"
        self.did.append("ask")
        if self.says is not None:
            self.held.append(self.says)
        return self._next(timeout_s)

    def read(self, asked: str, timeout_s: float) -> str:
        """Read one answer more."""
        assert asked == "*IDN?"
        self.did.append("read")
        return self._next(timeout_s)

    def drain(self) -> None:
        """Throw away what has arrived."""
        self.did.append("drain")
        for _ in range(min(self.drained, len(self.held))):
            self.held.popleft()

    def _next(self, timeout_s: float) -> str:
        if not self.held:
            raise LinkTimeout(f"nothing within {timeout_s:g} s")
        return self.held.popleft()


@pytest.mark.parametrize(
    ("carrier", "did"),
    [
        (Carrier([]), "drain ask ask"),
        (Carrier(["9.99"], drained=1), "drain ask ask"),
        (Carrier(["9.99"]), "drain ask read ask"),
        (Carrier(["9.99", '0,"No error"', "1"]), "drain ask read read read ask"),
        (Carrier(["9.99"] * 9, opened=[]), f"drain ask {'read ' * 8}open ask ask"),
        (Carrier(["9.99"] * 9, opened=["9.99"]), f"drain ask {'read ' * 8}open ask read ask"),
    ],
    ids=["nothing late", "drained", "later", "several", "too many", "after reopening"],
)
def test_late_answers_are_thrown_away(carrier: Carrier, did: str) -> None:
    """Wherever they come, the link is in step afterwards: the next answer is the next one's."""
    recover_link(carrier, IDENTITY, timeout_s=1.0)

    assert " ".join(carrier.did) == did
    assert carrier.ask("*IDN?", 1.0) == IDENTITY
    assert not carrier.held


def test_identity_that_comes_late_leaves_one_answer_too_many() -> None:
    """The link notices that before the next question; see ``test_link``."""
    carrier = Carrier([IDENTITY])

    recover_link(carrier, IDENTITY, timeout_s=1.0)

    assert list(carrier.held) == [IDENTITY]


@pytest.mark.parametrize("opened", [[], ["9.99"]])
def test_another_instrument(opened: list[str]) -> None:
    """Named as it answers, whatever stood before it; asked for anew on a fresh link first."""
    carrier = Carrier([], says=OTHER, opened=opened)

    with pytest.raises(IdentityError) as other:
        recover_link(carrier, IDENTITY, timeout_s=1.0)

    assert "open" in carrier.did
    assert OTHER in other.value.what or "9.99" in other.value.what
    assert (other.value.where, other.value.expected) == ("somewhere", IDENTITY)


def test_instrument_that_changes_while_it_is_asked() -> None:
    """The second identification has to agree with the first."""
    carrier = Carrier([IDENTITY], says=OTHER, opened=[])

    with pytest.raises(IdentityError):
        recover_link(carrier, IDENTITY, timeout_s=1.0)


@pytest.mark.parametrize("opened", [None, []])
def test_nobody_answers(opened: list[str] | None) -> None:
    """Neither on the old link nor on a new one."""
    with pytest.raises(LinkLost, match="does not come back") as lost:
        recover_link(Carrier([], says=None, opened=opened), IDENTITY, timeout_s=1.0)

    assert lost.value.where == "somewhere"


@pytest.mark.parametrize(
    ("carrier", "identity"),
    [
        (Carrier([]), IDENTITY),
        (Carrier([], says="AC-1"), "AC-1"),
        (Carrier(["+1.25E-03"], drained=1), IDENTITY),
        (Carrier(['0,"No error"'], drained=1), IDENTITY),
    ],
    ids=["four fields", "short", "late number", "late entry"],
)
def test_who_is_there_at_the_start(carrier: Carrier, identity: str) -> None:
    """A late answer for whoever was here before is no identity; a short one is, said twice."""
    assert identify(carrier, timeout_s=1.0) == identity
    assert not carrier.held
