"""Small checks that every link passes, whatever carries it.

A maker returns an open wire to an instrument that answers ``*IDN?`` with the wire's identity;
a talk says what else it answers, and what it never answers.
"""

from collections.abc import Callable
from dataclasses import dataclass

import pytest

from benchlog.bench.wire import Wire
from benchlog.errors import LinkError, Misuse

Maker = Callable[[], Wire]


@dataclass(frozen=True, slots=True)
class Talk:
    """What an instrument answers, and what it never answers."""

    question: str = "GOOD?"
    answer: str = "1.25"
    unanswered: str = "NEVER?"


USUAL = Talk()


def check_says_who_is_there(make: Maker, _talk: Talk = USUAL) -> None:
    """The identity is what ``*IDN?`` answers, and the wire is clean."""
    wire = make()
    assert wire.ask("*IDN?", timeout_s=1.0) == wire.identity
    assert not wire.dirty
    wire.close()


def check_answers_come_without_terminator(make: Maker, talk: Talk = USUAL) -> None:
    """Nor padding."""
    wire = make()
    assert wire.ask(talk.question, timeout_s=1.0) == talk.answer
    wire.close()


def check_close_twice_is_quiet(make: Maker, talk: Talk = USUAL) -> None:
    """And nothing can be asked afterwards."""
    wire = make()
    wire.close()
    wire.close()
    with pytest.raises(Misuse):
        wire.ask(talk.question, timeout_s=1.0)
    with pytest.raises(Misuse):
        wire.send("QUIET")
    with pytest.raises(Misuse):
        wire.recover()


def check_no_answer_makes_it_dirty(make: Maker, talk: Talk = USUAL) -> None:
    """A dirty wire takes nothing but recovery."""
    wire = make()
    with pytest.raises(LinkError):
        wire.ask(talk.unanswered, timeout_s=0.1)
    assert wire.dirty
    with pytest.raises(Misuse):
        wire.ask(talk.question, timeout_s=1.0)
    with pytest.raises(Misuse):
        wire.send("QUIET")
    wire.close()


def check_recovery_makes_it_clean(make: Maker, talk: Talk = USUAL) -> None:
    """The same instrument answers in step again; recovery of a clean wire is fine."""
    wire = make()
    with pytest.raises(LinkError):
        wire.ask(talk.unanswered, timeout_s=0.1)
    wire.recover()
    assert not wire.dirty
    assert wire.ask(talk.question, timeout_s=1.0) == talk.answer
    wire.recover()
    assert wire.ask(talk.question, timeout_s=1.0) == talk.answer
    wire.close()


ALL = (
    check_says_who_is_there,
    check_answers_come_without_terminator,
    check_close_twice_is_quiet,
    check_no_answer_makes_it_dirty,
    check_recovery_makes_it_clean,
)
