"""The same sweep gives the same points, bit for bit, however the bench is reached."""

from pathlib import Path

from benchlog.bench.replay import RecordingWire, ReplayWire
from benchlog.bench.runner import run_sweep
from benchlog.bench.setup import open_bench
from benchlog.bench.wire import Wire
from benchlog.practice.server import PracticeServer
from benchlog.practice.wire import PracticeWires
from benchlog.records import Point
from benchlog.sweep.schedule import log_spaced, spaced_schedule
from tests.fakes.practice_bench import bench_in_process, bench_over_tcp, noisy_world

# From 10 kHz on, where settling takes no real time worth mentioning.
SCHEDULE = spaced_schedule(log_spaced(1e4, 1e6, 5), 0.007)


def test_in_process_replayed_and_over_tcp(tmp_path: Path) -> None:
    """Noise included: simulated, played back and over real sockets are the same measurement."""
    simulated, replayed, over_tcp = list[Point](), list[Point](), list[Point]()
    recordings: list[RecordingWire] = []

    def recorded(wire: Wire) -> Wire:
        recordings.append(RecordingWire(wire))
        return recordings[-1]

    wires = PracticeWires(noisy_world())
    with bench_in_process(tmp_path, wires, recorded) as bench:
        assert run_sweep(bench, SCHEDULE, keep=simulated.append).state == "complete"

    playback = {
        wire.address: ReplayWire(wire.exchanges, identity=wire.identity, address=wire.address)
        for wire in recordings
    }
    with open_bench(
        bench.setup, open_wire=lambda place: playback[place.address], clock=wires.clock
    ) as bench:
        assert run_sweep(bench, SCHEDULE, keep=replayed.append).state == "complete"

    with PracticeServer(noisy_world()) as server, bench_over_tcp(tmp_path, server) as live:
        assert run_sweep(live, SCHEDULE, keep=over_tcp.append).state == "complete"

    assert len(simulated) == len(SCHEDULE.steps)
    assert len({point.gain for point in simulated}) == len(simulated)
    assert replayed == simulated
    assert over_tcp == simulated
