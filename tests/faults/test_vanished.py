"""An instrument that closes its connection in the middle of a sweep, over real sockets."""

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

SCHEDULE = spaced_schedule(log_spaced(1e5, 1e6, 2), 0.014)
GAINS = np.abs(NOMINAL.gain(np.array([step.frequency_hz for step in SCHEDULE.steps])))
# How long a closed connection is taken for a slow instrument.
TIMEOUT_S = 0.03


@pytest.mark.parametrize(
    ("role", "nth"),
    [
        ("source", 2),
        ("source", 4),
        ("source", 6),
        ("input meter", 3),
        ("output meter", 2),
        ("output meter", 4),
    ],
)
def test_connection_closed_in_mid_sweep(tmp_path: Path, role: Role, nth: int) -> None:
    """The link is opened anew, the point measured again, nothing hangs."""
    kept = list[Point]()
    world = perfect_world()
    with (
        PracticeServer(world, faults=faults_at(role, Fault(kind="closed", nth=nth))) as server,
        bench_over_tcp(tmp_path, server, timeout_s=TIMEOUT_S) as bench,
    ):
        result = run_sweep(bench, SCHEDULE, keep=kept.append)
        assert not world.drive.on

    assert (result.state, result.source_off) == ("complete", True)
    assert len(result.recoveries) == 1
    assert "went away" in result.recoveries[0].why
    assert [point.gain for point in kept] == pytest.approx(GAINS, rel=1e-4)
