"""The practice bench passes the checks of every wire, in the same process and over TCP."""

from collections.abc import Callable, Iterator

import pytest

from benchlog.bench.link import open_link
from benchlog.practice.server import PracticeServer
from benchlog.practice.wire import PracticeWires
from benchlog.practice.world import World
from tests.bench.wire_checks import ALL, Maker, Talk

# An order asked for an answer has none.
TALK = Talk(question="SYST:VERS?", answer="1999.0", unanswered="*CLS")
Check = Callable[[Maker, Talk], None]


@pytest.fixture(scope="module")
def server() -> Iterator[PracticeServer]:
    """Yield a running practice bench."""
    with PracticeServer(World()) as running:
        yield running


@pytest.mark.parametrize("check", ALL)
def test_in_process(check: Check) -> None:
    """On a clock that is a number."""
    check(lambda: PracticeWires(World()).open("source"), TALK)


@pytest.mark.parametrize("check", ALL)
def test_over_tcp(check: Check, server: PracticeServer) -> None:
    """Through the link that real instruments are reached by."""
    check(lambda: open_link(server.addresses.source, timeout_s=0.2), TALK)
