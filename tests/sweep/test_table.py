"""The rules of a sweep, pair by pair: what is legal and where it leads; the rest is refused."""

import pytest

from benchlog.records import Reading, Status
from benchlog.sweep.actions import (
    EVENTS,
    Action,
    CheckErrors,
    Done,
    EndSweep,
    Event,
    KeepPoint,
    Level,
    Prepare,
    Read,
    Recover,
    SetPoint,
    Settle,
    Stop,
    SwitchOff,
    SwitchOn,
    Trouble,
)
from benchlog.sweep.schedule import spaced_schedule
from benchlog.sweep.stepper import OFF_TRIES, Stepper, SweepMisuse
from benchlog.sweep.table import TABLE, State, When

LEVEL = Level(reading=Reading(value_vrms=0.5, status=Status.OK, raw="0.5"))
RETRIABLE = Trouble(why="no answer", retriable=True)
FINAL = Trouble(why="refused", retriable=False)
STOP = Stop(why="enough")
GIVEN: dict[str, Event] = {
    "done": Done(),
    "level": LEVEL,
    "retriable": RETRIABLE,
    "final": FINAL,
    "stop": STOP,
}

# The shortest way into each state.
WAY: dict[State, list[Event]] = {
    State.PREPARING: [],
    State.SETTING: [Done()],
    State.CHECKING_SETTING: [Done()] * 2,
    State.SWITCHING_ON: [Done()] * 3,
    State.SETTLING: [Done()] * 4,
    State.READING_INPUT: [Done()] * 5,
    State.READING_OUTPUT: [*[Done()] * 5, LEVEL],
    State.CHECKING_READINGS: [*[Done()] * 5, LEVEL, LEVEL],
    State.KEEPING: [*[Done()] * 5, LEVEL, LEVEL, Done()],
    State.STEPPING: [*[Done()] * 5, LEVEL, LEVEL, Done(), Done()],
    State.RECOVERING: [RETRIABLE],
    State.SWITCHING_OFF: [STOP],
    State.ENDED: [STOP, Done()],
}

_TROUBLE = {"retriable": State.RECOVERING, "final": State.SWITCHING_OFF}
_STOP = {"stop": State.SWITCHING_OFF}
# Written by hand from the rules in words, not taken from the table under test.
EXPECTED: dict[State, dict[str, State]] = {
    State.PREPARING: {"done": State.SETTING, **_TROUBLE, **_STOP},
    State.SETTING: {"done": State.CHECKING_SETTING, **_TROUBLE, **_STOP},
    State.CHECKING_SETTING: {"done": State.SWITCHING_ON, **_TROUBLE, **_STOP},
    State.SWITCHING_ON: {"done": State.SETTLING, **_TROUBLE, **_STOP},
    State.SETTLING: {"done": State.READING_INPUT, **_TROUBLE, **_STOP},
    State.READING_INPUT: {"level": State.READING_OUTPUT, **_TROUBLE, **_STOP},
    State.READING_OUTPUT: {"level": State.CHECKING_READINGS, **_TROUBLE, **_STOP},
    State.CHECKING_READINGS: {"done": State.KEEPING, **_TROUBLE, **_STOP},
    State.KEEPING: {
        "done": State.STEPPING,
        "retriable": State.SWITCHING_OFF,
        "final": State.SWITCHING_OFF,
        **_STOP,
    },
    State.STEPPING: {"done": State.SETTLING, **_TROUBLE, **_STOP},
    State.RECOVERING: {"done": State.PREPARING, **_TROUBLE, **_STOP},
    State.SWITCHING_OFF: {
        "done": State.ENDED,
        "retriable": State.SWITCHING_OFF,
        "final": State.SWITCHING_OFF,
        **_STOP,
    },
    State.ENDED: {},
}
PAIRS = [(state, name) for state in State for name in GIVEN]
LEGAL = [(state, name) for state, name in PAIRS if name in EXPECTED[state]]
ILLEGAL = [(state, name) for state, name in PAIRS if name not in EXPECTED[state]]

ASKS: dict[State, type[Action]] = {
    State.PREPARING: Prepare,
    State.SETTING: SetPoint,
    State.CHECKING_SETTING: CheckErrors,
    State.SWITCHING_ON: SwitchOn,
    State.SETTLING: Settle,
    State.READING_INPUT: Read,
    State.READING_OUTPUT: Read,
    State.CHECKING_READINGS: CheckErrors,
    State.KEEPING: KeepPoint,
    State.STEPPING: SetPoint,
    State.RECOVERING: Recover,
    State.SWITCHING_OFF: SwitchOff,
    State.ENDED: EndSweep,
}


def stepper_in(
    state: State, *, points: int = 2, input_meter: bool = True, retries: int = 2
) -> Stepper:
    """Return a stepper brought into a state by the shortest way."""
    schedule = spaced_schedule([100.0 * (n + 1) for n in range(points)], 0.1)
    stepper = Stepper(schedule, lambda _: 0.5, input_meter=input_meter, retries=retries)
    for event in WAY[state]:
        if input_meter or stepper.state is not State.READING_OUTPUT or event is LEVEL:
            stepper.feed(event)
    return stepper


@pytest.mark.parametrize("state", State)
def test_the_way_into_each_state(state: State) -> None:
    """Each state can be reached, and asks for its action, the same one however often asked."""
    stepper = stepper_in(state)

    assert stepper.state is state
    assert isinstance(stepper.next_action(), ASKS[state])
    assert stepper.next_action() == stepper.next_action()
    assert stepper.state is state


@pytest.mark.parametrize(("state", "name"), LEGAL)
def test_a_legal_pair_leads_where_the_rules_say(state: State, name: str) -> None:
    """Every legal pair of state and event leads to the state written down by hand."""
    stepper = stepper_in(state)

    stepper.feed(GIVEN[name])

    assert stepper.state is EXPECTED[state][name]


@pytest.mark.parametrize(("state", "name"), ILLEGAL)
def test_an_illegal_pair_is_refused_and_changes_nothing(state: State, name: str) -> None:
    """Every other pair raises, names state and event, and leaves state and action as they were."""
    stepper = stepper_in(state)
    action = stepper.next_action()

    with pytest.raises(SweepMisuse) as caught:
        stepper.feed(GIVEN[name])

    assert str(caught.value) == (
        f"{type(GIVEN[name]).__name__} was fed while the sweep was in state {state.value!r}"
    )
    assert stepper.state is state
    assert stepper.next_action() == action


def test_legal_and_illegal_pairs_are_all_pairs() -> None:
    """No pair is left out, and the table has a row for exactly the legal ones."""
    legal = {(state, type(GIVEN[name])) for state, name in LEGAL}

    assert len(LEGAL) + len(ILLEGAL) == len(State) * len(GIVEN)
    assert set(TABLE) == legal
    assert {type(event) for event in GIVEN.values()} == set(EVENTS)


def test_every_row_ends_in_a_branch_that_always_holds() -> None:
    """Only the last branch of a row is unconditional, so that every row decides."""
    for pair, branches in TABLE.items():
        conditions = [when for when, _ in branches]

        assert conditions[-1] is When.ALWAYS, pair
        assert When.ALWAYS not in conditions[:-1], pair


def test_without_an_input_meter_only_the_output_is_read() -> None:
    """Settling leads straight to the output where there is no meter at the input."""
    stepper = stepper_in(State.SETTLING, input_meter=False)

    stepper.feed(Done())

    assert stepper.state is State.READING_OUTPUT


def test_the_last_point_leads_out() -> None:
    """After the last point is kept the source goes off and the sweep is complete."""
    stepper = stepper_in(State.KEEPING, points=1)

    stepper.feed(Done())
    assert stepper.state is State.SWITCHING_OFF
    stepper.feed(Done())

    assert stepper.next_action() == EndSweep(
        state="complete", why="All points were measured.", source_off=True
    )


@pytest.mark.parametrize("retries", [0, 1, 3])
def test_retries_are_bounded(retries: int) -> None:
    """One point is begun again so often and no more; then the sweep fails."""
    stepper = stepper_in(State.SETTLING, retries=retries)

    for _ in range(retries):
        stepper.feed(RETRIABLE)
        assert stepper.state is State.RECOVERING
    stepper.feed(RETRIABLE)

    assert stepper.state is State.SWITCHING_OFF
    assert [recovery.attempt for recovery in stepper.recoveries] == [*range(1, retries + 1)]


def test_switching_off_is_tried_so_often_and_no_more() -> None:
    """Failing to switch off ends in words that nobody can miss."""
    stepper = stepper_in(State.SWITCHING_OFF)

    for _ in range(OFF_TRIES - 1):
        stepper.feed(FINAL)
        assert stepper.state is State.SWITCHING_OFF
    stepper.feed(FINAL)

    assert stepper.next_action() == EndSweep(
        state="stopped",
        why="enough THE SOURCE COULD NOT BE SWITCHED OFF and may still drive the board:"
        " switch it off by hand. (refused)",
        source_off=False,
    )
