"""What errors say and which exit code they carry."""

import pytest

from benchlog import errors
from benchlog.errors import BenchlogError, ExitCode, LinkTimeout, ReplyError


def test_message_names_place_expectation_and_next_step() -> None:
    """The four parts stand on lines of their own, labelled."""
    error = BenchlogError("no answer", where="source", expected="a reply", hint="switch it on")

    assert str(error) == (
        "no answer\n  where:    source\n  expected: a reply\n  do:       switch it on"
    )


def test_parts_that_are_not_given_are_not_printed() -> None:
    """A message without place or hint is one line."""
    assert str(BenchlogError("the disk is full")) == "the disk is full"


def test_at_puts_a_place_in_front_and_keeps_the_rest() -> None:
    """A file name is added by whoever knows it; the error itself is not changed."""
    inner = ReplyError("not a number", where="READ?", raw="OVLD")
    placed = inner.at("output meter")

    assert placed.where == "output meter: READ?"
    assert placed.raw == "OVLD"
    assert inner.where == "READ?"
    assert type(placed) is ReplyError


@pytest.mark.parametrize(
    ("name", "code"),
    [
        ("DesignFileError", ExitCode.NOT_DONE),
        ("LogbookError", ExitCode.NOT_DONE),
        ("LinkTimeout", ExitCode.INSTRUMENT),
        ("CommandRefused", ExitCode.INSTRUMENT),
        ("SweepStopped", ExitCode.STOPPED),
    ],
)
def test_exit_code_belongs_to_the_error_class(name: str, code: int) -> None:
    """Scripts tell a bad file from a bad bench by the exit code."""
    assert getattr(errors, name).exit_code == code


def test_link_errors_are_os_errors_too() -> None:
    """Code that already catches OSError keeps working."""
    assert isinstance(LinkTimeout("no answer"), OSError)
