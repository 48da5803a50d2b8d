"""The rules of a sweep: everything that decides what happens next stands in this one table.

Each row reads: in this state, when this event is fed, the first branch whose condition holds names
the next state.  A pair that has no row is out of turn.  The stepper only carries the rules out;
the diagram in DEVELOPERS.md is drawn from them.
"""

from enum import Enum
from typing import TypeAlias

from benchlog.sweep.actions import Done, Event, Level, Stop, Trouble


class State(Enum):
    """What the stepper waits for; the value is how people read it."""

    PREPARING = "preparing"
    SETTING = "setting the point, output off"
    CHECKING_SETTING = "checking the setting"
    SWITCHING_ON = "switching on"
    SETTLING = "settling"
    READING_INPUT = "reading the input"
    READING_OUTPUT = "reading the output"
    CHECKING_READINGS = "checking the readings"
    KEEPING = "keeping the point"
    STEPPING = "setting the next point, output on"
    RECOVERING = "recovering the links"
    SWITCHING_OFF = "switching off"
    ENDED = "ended"


class When(Enum):
    """The condition of a branch."""

    ALWAYS = ""
    INPUT_METER = "there is an input meter"
    STEPS_LEFT = "steps are left"
    RETRY = "retriable, tries left"
    OFF_TRIES_LEFT = "tries left"


Branches: TypeAlias = tuple[tuple[When, State], ...]


def _to(state: State) -> Branches:
    return ((When.ALWAYS, state),)


# Trouble while a point is being measured starts that point again from the beginning: after it
# nobody knows what the instruments are set to, nor which answer belongs to which question.
MEASURING = (
    State.PREPARING,
    State.SETTING,
    State.CHECKING_SETTING,
    State.SWITCHING_ON,
    State.SETTLING,
    State.READING_INPUT,
    State.READING_OUTPUT,
    State.CHECKING_READINGS,
    State.STEPPING,
    State.RECOVERING,
)
_AGAIN_OR_OFF: Branches = (
    (When.RETRY, State.RECOVERING),
    (When.ALWAYS, State.SWITCHING_OFF),
)

TABLE: dict[tuple[State, type[Event]], Branches] = {
    # the way in: the level is set and found accepted before the output is on
    (State.PREPARING, Done): _to(State.SETTING),
    (State.SETTING, Done): _to(State.CHECKING_SETTING),
    (State.CHECKING_SETTING, Done): _to(State.SWITCHING_ON),
    (State.SWITCHING_ON, Done): _to(State.SETTLING),
    # the round of each point
    (State.SETTLING, Done): (
        (When.INPUT_METER, State.READING_INPUT),
        (When.ALWAYS, State.READING_OUTPUT),
    ),
    (State.READING_INPUT, Level): _to(State.READING_OUTPUT),
    (State.READING_OUTPUT, Level): _to(State.CHECKING_READINGS),
    (State.CHECKING_READINGS, Done): _to(State.KEEPING),
    (State.KEEPING, Done): (
        (When.STEPS_LEFT, State.STEPPING),
        (When.ALWAYS, State.SWITCHING_OFF),
    ),
    (State.STEPPING, Done): _to(State.SETTLING),
    # trouble
    (State.RECOVERING, Done): _to(State.PREPARING),
    **{(state, Trouble): _AGAIN_OR_OFF for state in MEASURING},
    # a point that could not be kept is not measured again as if nothing had happened
    (State.KEEPING, Trouble): _to(State.SWITCHING_OFF),
    # stop
    **{(state, Stop): _to(State.SWITCHING_OFF) for state in (*MEASURING, State.KEEPING)},
    # the way out: there is one, and it switches the source off
    (State.SWITCHING_OFF, Done): _to(State.ENDED),
    (State.SWITCHING_OFF, Trouble): (
        (When.OFF_TRIES_LEFT, State.SWITCHING_OFF),
        (When.ALWAYS, State.ENDED),
    ),
    (State.SWITCHING_OFF, Stop): _to(State.SWITCHING_OFF),
}
