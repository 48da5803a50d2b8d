"""Laws that hold for every sequence of events, found by trying many."""

from hypothesis import given, settings
from hypothesis import strategies as st

from benchlog.records import Reading, Status
from benchlog.sweep.actions import (
    Action,
    Done,
    EndSweep,
    Event,
    KeepPoint,
    Level,
    Read,
    Stop,
    SwitchOff,
    SwitchOn,
    Trouble,
)
from benchlog.sweep.schedule import spaced_schedule
from benchlog.sweep.stepper import OFF_TRIES, Stepper, SweepMisuse

readings = st.sampled_from(
    [
        Level(reading=Reading(value_vrms=1.0, status=Status.OK, raw="1")),
        Level(reading=Reading(value_vrms=None, status=Status.OVERLOAD, raw="9.9E37")),
    ]
)
troubles = st.builds(Trouble, why=st.just("trouble"), retriable=st.booleans())
events = st.one_of(
    st.just(Done()), st.just(Done()), readings, troubles, st.just(Stop(why="enough"))
)
# Mostly healthy, so that sweeps also get far.
healthy_or_not = st.one_of(st.none(), st.none(), st.none(), events)


def run(
    what: list[Event | None], *, points: int, retries: int, input_meter: bool
) -> list[tuple[Action, Event]]:
    """Feed events (None: what a healthy bench would say), then heal, and run to the end."""
    schedule = spaced_schedule([10.0 * (n + 1) for n in range(points)], 0.1)
    stepper = Stepper(schedule, lambda _: 0.0, input_meter=input_meter, retries=retries)
    happened: list[tuple[Action, Event]] = []
    pending = iter(what)
    while not isinstance(action := stepper.next_action(), EndSweep):
        good: Event = (
            Level(reading=Reading(value_vrms=1.0, status=Status.OK, raw="1"))
            if isinstance(action, Read)
            else Done()
        )
        event = next(pending, None) or good
        before = stepper.state
        try:
            stepper.feed(event)
        except SweepMisuse:
            assert stepper.state is before
            assert stepper.next_action() == action
            continue
        happened.append((action, event))
        assert len(happened) < 12 * (retries + 2) * (points + 1) + len(what)
    assert stepper.next_action() == action
    return [*happened, (action, Done())]


sweeps = st.fixed_dictionaries(
    {
        "what": st.lists(healthy_or_not, max_size=60),
        "points": st.integers(1, 4),
        "retries": st.integers(0, 2),
        "input_meter": st.booleans(),
    }
)


@given(sweeps)
@settings(max_examples=300, deadline=None)
def test_the_source_goes_off_before_the_end(sweep: dict[str, object]) -> None:
    """Once switching on was asked for, the last thing done is to switch off, or it is said."""
    happened = run(**sweep)  # type: ignore[arg-type]
    end = happened[-1][0]
    before = [(action, event) for action, event in happened[:-1]]

    assert isinstance(end, EndSweep)
    assert isinstance(before[-1][0], SwitchOff)
    assert end.source_off == isinstance(before[-1][1], Done)
    assert end.source_off or "COULD NOT BE SWITCHED OFF" in end.why
    failed = [e for a, e in before if isinstance(a, SwitchOff) and isinstance(e, Trouble)]
    assert len(failed) <= OFF_TRIES
    first_off = next(n for n, (action, _) in enumerate(before) if isinstance(action, SwitchOff))
    assert not any(isinstance(action, SwitchOn) for action, _ in before[first_off:])


@given(sweeps)
@settings(max_examples=300, deadline=None)
def test_no_point_is_kept_twice_and_order_is_kept(sweep: dict[str, object]) -> None:
    """Kept points are 0, 1, 2 ... without gap or repeat; all of them when complete."""
    happened = run(**sweep)  # type: ignore[arg-type]
    kept = [
        action.point
        for action, event in happened
        if isinstance(action, KeepPoint) and isinstance(event, Done)
    ]
    end = happened[-1][0]

    assert [point.position for point in kept] == [*range(len(kept))]
    assert isinstance(end, EndSweep)
    assert (end.state == "complete") == (len(kept) == sweep["points"])
    retries = sweep["retries"]
    assert isinstance(retries, int)
    assert all(1 <= point.attempts <= retries + 1 for point in kept)
