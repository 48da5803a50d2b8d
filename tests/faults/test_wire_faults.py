"""Every kind of unkindness at every reply of every instrument, in virtual time.

A kept point has the gain of its own frequency, or is flagged; nothing else is accepted.
"""

from collections import Counter
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from benchlog.bench.replay import RecordingWire
from benchlog.bench.runner import SweepResult, run_sweep
from benchlog.bench.wire import Wire
from benchlog.practice.bench import ROLES, Role
from benchlog.practice.faults import Fault, FaultKind
from benchlog.practice.wire import PracticeWires
from benchlog.records import Point, PointFlag
from benchlog.sweep.schedule import spaced_schedule
from tests.fakes.practice_bench import NOMINAL, bench_in_process, faults_at, perfect_world

SCHEDULE = spaced_schedule([1e3, 3e4, 1e6], 0.007)
KINDS: tuple[FaultKind, ...] = (
    "late",
    "split",
    "stale",
    "garbled",
    "dropped",
    "closed",
    "overloaded",
)
DELAY_S = 20.0  # longer than any timeout; it costs nothing here


def swept(folder: Path, wires: PracticeWires) -> tuple[SweepResult, list[Point], Counter[str]]:
    """Sweep once; return also how many answers each instrument gave."""
    kept: list[Point] = []
    recordings: list[RecordingWire] = []

    def recorded(wire: Wire) -> Wire:
        recordings.append(RecordingWire(wire))
        return recordings[-1]

    with bench_in_process(folder, wires, recorded) as bench:
        result = run_sweep(bench, SCHEDULE, keep=kept.append)
    answers = Counter[str]()
    for wire in recordings:
        answers[wire.address.removeprefix("practice::")] = len(wire.exchanges)
    return result, kept, answers


@pytest.fixture(scope="module")
def healthy(tmp_path_factory: pytest.TempPathFactory) -> tuple[list[Point], Counter[str]]:
    """Return the points of a sweep without faults, and how many answers each instrument gave."""
    result, kept, answers = swept(
        tmp_path_factory.mktemp("healthy"), PracticeWires(perfect_world())
    )
    assert (result.state, result.recoveries) == ("complete", ())
    # The last answer comes when the bench is closed, after the sweep.
    answers["source"] -= 1
    return kept, answers


def assert_sound(
    result: SweepResult, kept: list[Point], wires: PracticeWires, truth: list[Point]
) -> None:
    """No wrong point, none lost, source off."""
    assert [point.position for point in kept] == [*range(len(kept))]
    assert (result.state == "complete") == (len(kept) == len(SCHEDULE.steps))
    for point, true_point in zip(kept, truth, strict=False):
        if point.flags is PointFlag.NONE:
            assert replace(point, attempts=1) == true_point
        else:
            assert point.gain is None
            assert point.raw is not None
    assert result.source_off
    assert not wires.world.drive.on


def test_the_healthy_points_are_right(healthy: tuple[list[Point], Counter[str]]) -> None:
    """What the other tests compare with is the gain of the board on the table."""
    kept, _ = healthy
    gains = np.abs(NOMINAL.gain(np.array([point.frequency_hz for point in kept])))

    assert [point.gain for point in kept] == pytest.approx(gains, rel=1e-4)


@pytest.mark.parametrize("role", ROLES)
@pytest.mark.parametrize("kind", KINDS)
def test_each_fault_at_each_reply_once(
    tmp_path: Path, healthy: tuple[list[Point], Counter[str]], kind: FaultKind, role: Role
) -> None:
    """One unkind reply, whichever it is, never spoils a point, and the sweep gets through."""
    truth, answers = healthy
    states = 0
    for nth in range(1, answers[role] + 1):
        fault = Fault(kind=kind, nth=nth, delay_s=DELAY_S)
        wires = PracticeWires(perfect_world(), faults=faults_at(role, fault))

        result, kept, _ = swept(tmp_path, wires)

        assert_sound(result, kept, wires, truth)
        assert result.state == "complete", (nth, result.why)
        states += any(point.flags for point in kept)
    assert bool(states) == (kind == "overloaded" and role != "source")


@pytest.mark.parametrize("role", ROLES)
@pytest.mark.parametrize("kind", ["late", "dropped", "garbled"])
def test_each_fault_from_each_reply_on(
    tmp_path: Path, healthy: tuple[list[Point], Counter[str]], kind: FaultKind, role: Role
) -> None:
    """An instrument that goes bad for good ends the sweep; what was kept before stays right."""
    truth, answers = healthy
    for nth in range(1, answers[role] + 1):
        fault = Fault(kind=kind, nth=nth, for_good=True, delay_s=DELAY_S)
        wires = PracticeWires(perfect_world(), faults=faults_at(role, fault))

        result, kept, _ = swept(tmp_path, wires)

        if role != "source":
            assert_sound(result, kept, wires, truth)
        else:
            assert not result.source_off
            assert "COULD NOT BE SWITCHED OFF" in result.why
        assert result.error is not None
