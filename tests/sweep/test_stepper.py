"""What the stepper asks for on its way through a schedule."""

import pytest

from benchlog.records import Point, Reading, Status
from benchlog.sweep.actions import (
    Action,
    Done,
    EndSweep,
    Event,
    KeepPoint,
    Level,
    Read,
    Recover,
    Recovery,
    SetPoint,
    Settle,
    Stop,
    SwitchOff,
    SwitchOn,
    Trouble,
)
from benchlog.sweep.schedule import Schedule, Step
from benchlog.sweep.stepper import OFF_FAILED, Stepper

LATE = Trouble(why="no answer", retriable=True)


def two_points(**changes: float) -> Schedule:
    """Return a schedule of two points."""
    steps = (
        Step(position=0, frequency_hz=100.0, level_vrms=0.1, output_vrms=4.8),
        Step(position=1, frequency_hz=200.0, level_vrms=0.2, output_vrms=9.6),
    )
    return Schedule(steps=steps, **changes)  # type: ignore[arg-type]


def reading(value_vrms: float) -> Level:
    """Return what a meter answered."""
    return Level(reading=Reading(value_vrms=value_vrms, status=Status.OK, raw=str(value_vrms)))


def answer(action: Action, levels: dict[str, float]) -> Event:
    """Return what a healthy bench would answer."""
    return reading(levels[action.which]) if isinstance(action, Read) else Done()


def walk(stepper: Stepper, troubles: dict[int, Event] | None = None) -> list[Action]:
    """Run to the end, answering the n-th action (from 1) with trouble; return what was asked."""
    asked: list[Action] = []
    while not isinstance(action := stepper.next_action(), EndSweep):
        asked.append(action)
        trouble = (troubles or {}).get(len(asked))
        stepper.feed(trouble or answer(action, {"input": 0.1, "output": 4.8}))
    return [*asked, action]


def kept(asked: list[Action]) -> list[Point]:
    """Return the points that were asked to be kept."""
    return [action.point for action in asked if isinstance(action, KeepPoint)]


def test_a_sweep_in_order() -> None:
    """Set and checked before it is on; every point settled, read, checked, kept; off at the end."""
    asked = walk(Stepper(two_points(), lambda hz: 50 / hz, input_meter=True))

    names = [type(action).__name__ for action in asked]
    assert names == [
        *("Prepare", "SetPoint", "CheckErrors", "SwitchOn"),
        *("Settle", "Read", "Read", "CheckErrors", "KeepPoint"),
        *("SetPoint", "Settle", "Read", "Read", "CheckErrors", "KeepPoint"),
        *("SwitchOff", "EndSweep"),
    ]
    assert asked[1] == SetPoint(frequency_hz=100.0, level_vrms=0.1)
    assert asked[4] == Settle(seconds=0.5)
    assert asked[5] == Read(which="input", frequency_hz=100.0, expected_vrms=0.1)
    assert asked[6] == Read(which="output", frequency_hz=100.0, expected_vrms=4.8)


def test_the_points_of_a_sweep() -> None:
    """A point holds what was programmed, what was read, and gain as output over input."""
    points = kept(walk(Stepper(two_points(), lambda _: 0.0, input_meter=True)))

    assert points == [
        Point(
            position=position,
            frequency_hz=frequency_hz,
            level_vrms=level_vrms,
            input_vrms=0.1,
            output_vrms=4.8,
            gain=4.8 / 0.1,
        )
        for position, frequency_hz, level_vrms in ((0, 100.0, 0.1), (1, 200.0, 0.2))
    ]


def test_trouble_begins_the_point_again_from_the_start() -> None:
    """After trouble: recover, prepare, set the same point, switch on, settle and read anew."""
    stepper = Stepper(two_points(), lambda _: 0.0, input_meter=True)

    asked = walk(stepper, {13: LATE})  # the second point's output reading

    names = [type(action).__name__ for action in asked[12:24]]
    assert names == [
        *("Read", "Recover", "Prepare", "SetPoint", "CheckErrors", "SwitchOn"),
        *("Settle", "Read", "Read", "CheckErrors", "KeepPoint", "SwitchOff"),
    ]
    assert asked[15] == SetPoint(frequency_hz=200.0, level_vrms=0.2)
    assert [point.attempts for point in kept(asked)] == [1, 2]
    assert stepper.recoveries == (Recovery(position=1, attempt=1, why="no answer"),)


def test_readings_before_trouble_are_forgotten() -> None:
    """An input reading taken before a trouble never meets an output reading taken after it."""
    stepper = Stepper(two_points(), lambda _: 0.0, input_meter=True)
    for event in (Done(), Done(), Done(), Done(), Done(), reading(777.0), LATE):
        stepper.feed(event)

    points = kept(walk(stepper))

    assert points[0].input_vrms == 0.1


def test_attempts_are_counted_for_each_point() -> None:
    """The tries of one point are not taken from the next."""
    stepper = Stepper(two_points(), lambda _: 0.0, input_meter=True, retries=1)
    first_read, second_read = 6, 6 + 14

    asked = walk(stepper, {first_read: LATE, second_read: LATE})

    assert [point.attempts for point in kept(asked)] == [2, 2]
    assert isinstance(asked[-1], EndSweep)
    assert asked[-1].state == "complete"


def test_recovery_waits_longer_each_time() -> None:
    """A late answer is drained at once; an instrument that is away gets time to come back."""
    stepper = Stepper(two_points(), lambda _: 0.0, input_meter=True, retries=3)

    pauses = []
    for _ in range(3):
        stepper.feed(LATE)
        action = stepper.next_action()
        assert isinstance(action, Recover)
        pauses.append(action.pause_s)

    assert pauses == [0.0, 1.0, 2.0]


def test_a_point_that_could_not_be_kept_ends_the_sweep() -> None:
    """The logbook's trouble is not answered by measuring again."""
    stepper = Stepper(two_points(), lambda _: 0.0, input_meter=True)

    asked = walk(stepper, {9: Trouble(why="the disk is full", retriable=True)})

    assert [type(action).__name__ for action in asked[8:]] == ["KeepPoint", "SwitchOff", "EndSweep"]
    assert asked[-1] == EndSweep(state="failed", why="the disk is full", source_off=True)
    assert stepper.recoveries == ()


def test_a_failed_switch_on_is_followed_by_switching_off() -> None:
    """Nobody knows whether the output is on after a failed command: it is switched off."""
    stepper = Stepper(two_points(), lambda _: 0.0, input_meter=True)

    asked = walk(stepper, {4: Trouble(why="refused", retriable=False)})

    assert [type(action) for action in asked[3:]] == [SwitchOn, SwitchOff, EndSweep]


def test_a_stop_after_the_last_point_changes_nothing() -> None:
    """A sweep that is complete stays complete when the stop comes while it switches off."""
    stepper = Stepper(two_points(), lambda _: 0.0, input_meter=True)

    asked = walk(stepper, {16: Stop(why="Ctrl-C")})

    assert [type(action) for action in asked[15:]] == [SwitchOff, SwitchOff, EndSweep]
    assert asked[-1] == EndSweep(state="complete", why="All points were measured.", source_off=True)


@pytest.mark.parametrize("state", ["complete", "stopped", "failed"])
def test_failing_to_switch_off_keeps_the_state_and_says_so(state: str) -> None:
    """How the measuring ended and that the source is still on are both said."""
    stepper = Stepper(two_points(), lambda _: 0.0, input_meter=True)
    first: dict[str, dict[int, Event]] = {
        "complete": {},
        "stopped": {5: Stop(why="Ctrl-C")},
        "failed": {5: Trouble(why="refused", retriable=False)},
    }
    never = dict.fromkeys(range(16 if state == "complete" else 6, 40), LATE)

    end = walk(stepper, {**never, **first[state]})[-1]

    assert isinstance(end, EndSweep)
    assert end.state == state
    assert not end.source_off
    assert OFF_FAILED in end.why
    assert "(no answer)" in end.why


def test_an_attenuator_before_the_input_meter() -> None:
    """A meter after the attenuator sees the board's input level; one before it, more."""
    after = Stepper(two_points(attenuation=10.0), lambda _: 0.0, input_meter=True)
    before = Stepper(
        two_points(attenuation=10.0, meter_before_attenuator=True),
        lambda _: 0.0,
        input_meter=True,
    )

    expected = {}
    for name, stepper in (("after", after), ("before", before)):
        read = next(a for a in walk(stepper) if isinstance(a, Read) and a.which == "input")
        expected[name] = read.expected_vrms

    assert expected == {"after": 0.1 / 10, "before": 0.1}
