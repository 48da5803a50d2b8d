"""A reply that comes too late, over a real socket, never lands on another frequency."""

from pathlib import Path

import numpy as np
import pytest

from benchlog.bench.runner import run_sweep
from benchlog.practice.bench import Role
from benchlog.practice.faults import Fault
from benchlog.practice.server import PracticeServer
from benchlog.records import Point
from benchlog.sweep.schedule import log_spaced, spaced_schedule
from tests.fakes.practice_bench import NOMINAL, bench_over_tcp, faults_at, perfect_world

SCHEDULE = spaced_schedule(log_spaced(2e4, 2e6, 2), 0.014)
TIMEOUT_S = 0.08
GAINS = np.abs(NOMINAL.gain(np.array([step.frequency_hz for step in SCHEDULE.steps])))


WHILE_RECOVERING_S, AFTER_REOPENING_S = 0.12, 0.3


@pytest.mark.parametrize(
    ("role", "delay_s"),
    [
        ("source", WHILE_RECOVERING_S),
        ("output meter", WHILE_RECOVERING_S),
        ("output meter", AFTER_REOPENING_S),
    ],
)
def test_late_replies(tmp_path: Path, role: Role, delay_s: float) -> None:
    """A reply comes late; its point is measured again and has its own frequency's gain."""
    fault = Fault(kind="late", nth=6, delay_s=delay_s)
    kept = list[Point]()
    world = perfect_world()
    with (
        PracticeServer(world, faults=faults_at(role, fault)) as server,
        bench_over_tcp(tmp_path, server, timeout_s=TIMEOUT_S) as bench,
    ):
        result = run_sweep(bench, SCHEDULE, keep=kept.append)
        assert not world.drive.on

    assert (result.state, result.source_off) == ("complete", True)
    assert len(result.recoveries) == 1
    assert all("no answer" in recovery.why for recovery in result.recoveries)
    assert [point.gain for point in kept] == pytest.approx(GAINS, rel=1e-4)
    assert sorted(point.attempts for point in kept) == [1, 1, 1, 1, 2]


def test_a_meter_that_is_always_late(tmp_path: Path) -> None:
    """What was kept before it became late is right; the sweep fails, the source is off."""
    fault = Fault(kind="late", nth=6, for_good=True, delay_s=0.12)
    kept = list[Point]()
    world = perfect_world()
    with (
        PracticeServer(world, faults=faults_at("output meter", fault)) as server,
        bench_over_tcp(tmp_path, server, timeout_s=TIMEOUT_S) as bench,
    ):
        result = run_sweep(bench, SCHEDULE, keep=kept.append, retries=0)
        assert not world.drive.on

    assert (result.state, result.source_off) == ("failed", True)
    assert result.error is not None
    assert 1 <= len(kept) < len(SCHEDULE.steps)
    assert [point.gain for point in kept] == pytest.approx(GAINS[: len(kept)], rel=1e-4)


def test_a_repeated_reply(tmp_path: Path) -> None:
    """A reply that comes once more before the next one is not taken for it."""
    fault = Fault(kind="stale", nth=6)
    kept = list[Point]()
    with (
        PracticeServer(perfect_world(), faults=faults_at("output meter", fault)) as server,
        bench_over_tcp(tmp_path, server) as bench,
    ):
        result = run_sweep(bench, SCHEDULE, keep=kept.append)

    assert (result.state, len(result.recoveries)) == ("complete", 1)
    assert [point.gain for point in kept] == pytest.approx(GAINS, rel=1e-4)
