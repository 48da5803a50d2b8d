"""Error queue and registers."""

import pytest

from benchlog.practice.status import QUEUE_DEPTH, Group, Status


def test_starts_with_the_power_on_bit_and_no_error() -> None:
    """A controller can see that the instrument was switched off in between."""
    status = Status()
    assert status.take_events() == 128
    assert status.take_events() == 0
    assert status.next_error() == '0,"No error"'


def test_queue_is_first_in_first_out() -> None:
    """The oldest error is answered first."""
    status = Status()
    for number in (-113, -222, -410):
        status.report(number)
    assert status.error_count() == 3
    assert status.all_errors() == (
        '-113,"Undefined header",-222,"Data out of range",-410,"Query INTERRUPTED"'
    )
    assert status.all_errors() == '0,"No error"'


def test_overflow_replaces_the_last_entry_and_loses_the_new_one() -> None:
    """The queue never grows beyond its depth."""
    status = Status()
    for _ in range(QUEUE_DEPTH):
        status.report(-113)
    assert "-350" not in status.next_error()
    status.report(-113)
    status.report(-222)
    entries = [status.next_error() for _ in range(QUEUE_DEPTH)]
    assert entries[-1] == '-350,"Queue overflow"'
    assert all("-222" not in entry for entry in entries)


def test_clear_leaves_the_enable_registers() -> None:
    """``*CLS`` clears what happened, not what is wanted (IEEE 488.2, 10.3, from memory)."""
    status = Status(event_enable=32, service_enable=4)
    status.questionable = Group(event=1, enable=2)
    status.report(-113)
    status.complete_at(5.0)
    status.clear()
    status.catch_up(9.0)
    assert (status.events, status.error_count(), status.questionable.event) == (0, 0, 0)
    assert (status.event_enable, status.service_enable, status.questionable.enable) == (32, 4, 2)


def test_operation_complete_comes_in_its_time() -> None:
    """The bit is set once, when the pending operation has ended."""
    status = Status(events=0)
    status.complete_at(5.0)
    status.catch_up(4.9)
    assert status.events == 0
    status.catch_up(5.0)
    assert status.take_events() == 1
    status.catch_up(6.0)
    assert status.take_events() == 0


@pytest.mark.parametrize(
    ("prepare", "byte"),
    [
        ({}, 0),
        ({"events": 32}, 0),
        ({"events": 32, "event_enable": 32}, 32),
        ({"events": 32, "event_enable": 32, "service_enable": 32}, 96),
        ({"questionable": Group(event=1, enable=1)}, 8),
        ({"operation": Group(event=1, enable=1), "service_enable": 128}, 192),
        ({"operation": Group(event=1)}, 0),
    ],
)
def test_status_byte(prepare: dict[str, object], byte: int) -> None:
    """Summary bits count only what is enabled; bit 6 sums up what asks for service."""
    status = Status(events=0)
    for name, value in prepare.items():
        setattr(status, name, value)
    assert status.byte(message_available=False) == byte
    assert status.byte(message_available=True) == byte | 16


def test_error_in_the_queue_shows_in_the_status_byte() -> None:
    """Bit 2 says that the queue holds something."""
    status = Status(events=0)
    status.report(-113)
    assert status.byte(message_available=False) == 4
    status.next_error()
    assert status.byte(message_available=False) == 0


def test_event_of_a_group_is_read_once() -> None:
    """Reading clears it."""
    group = Group(event=5)
    assert (group.take_event(), group.take_event()) == (5, 0)
