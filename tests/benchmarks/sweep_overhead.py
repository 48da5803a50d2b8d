"""Sweep time beside the bare loop that a user would write, same instruments, same waits.

Both talk over TCP to the practice bench, in turn, in one process; the sweep keeps every point in a
logbook.  Instruments on a local bus answer in about 2 ms; ``--latency`` adds that to each reply.
Prints one line: the two medians, their ratio, and the own time for each point.

    python tests/benchmarks/sweep_overhead.py [--small] [--rounds N]
"""

import argparse
import statistics
import tempfile
import time
from pathlib import Path

import pyvisa

from benchlog.bench.setup import Bench, open_bench, read_bench
from benchlog.cli.new import bench_text
from benchlog.cli.street import begin, new_uuid, now
from benchlog.design.example import EXAMPLE_DESIGN
from benchlog.design.model import Design
from benchlog.design.read import parse_design
from benchlog.logbook.store import Logbook
from benchlog.practice.bench import ROLES, Role
from benchlog.practice.board import PracticeBoard
from benchlog.practice.faults import Fault
from benchlog.practice.server import PracticeServer
from benchlog.practice.world import World
from benchlog.records import SweepStart
from benchlog.sweep.from_design import schedule_for
from benchlog.sweep.schedule import Schedule


def main() -> None:
    """Measure both and print one line."""
    options = argparse.ArgumentParser(description=__doc__)
    options.add_argument("--small", action="store_true", help="one round, few points")
    options.add_argument("--rounds", type=int, default=5)
    options.add_argument("--latency", type=float, default=0.002, help="seconds for each reply")
    chosen = options.parse_args()
    rounds = 1 if chosen.small else chosen.rounds
    slow = [Fault(kind="late", nth=1, for_good=True, delay_s=chosen.latency)]
    faults: dict[Role, list[Fault]] = dict.fromkeys(ROLES, slow)
    design = parse_design(EXAMPLE_DESIGN, where="the example design")
    world = World(PracticeBoard(design, seed=1), seed=1)
    with tempfile.TemporaryDirectory() as name, PracticeServer(world, faults=faults) as server:
        folder = Path(name)
        ports = [int(address.split("::")[2]) for address in server.addresses]
        (folder / "bench.toml").write_text(bench_text((ports[0], ports[1], ports[2])))
        setup = read_bench(folder / "bench.toml")
        schedule = schedule_for(design, setup.limits())
        if chosen.small:
            schedule = Schedule(steps=schedule.steps[::10])
        bare, ours = [], []
        for _ in range(rounds):
            with open_bench(setup) as bench:
                waits = [_settle_s(bench, step.frequency_hz) for step in schedule.steps]
                ours.append(_ours(bench, schedule, design, folder))
            bare.append(_bare(list(server.addresses), schedule, waits))
    own_ms = 1e3 * (statistics.median(ours) - statistics.median(bare)) / len(schedule.steps)
    print(  # noqa: T201 - a script's output
        f"sweep of {len(schedule.steps)} points over TCP, {1e3 * chosen.latency:g} ms replies:"
        f" bare loop {statistics.median(bare):.3f} s, with logbook {statistics.median(ours):.3f} s,"
        f" ratio {statistics.median(ours) / statistics.median(bare):.3f},"
        f" own time {own_ms:.2f} ms a point"
    )


def _settle_s(bench: Bench, frequency_hz: float) -> float:
    return max(bench.source.settle_s(frequency_hz), bench.output_meter.settle_s(frequency_hz))


def _ours(bench: Bench, schedule: Schedule, design: Design, folder: Path) -> float:
    """Return the seconds of one sweep into a logbook."""
    from benchlog.bench.runner import run_sweep

    with Logbook(folder / f"{new_uuid()}.db", create=True) as logbook:
        start = SweepStart(
            uuid=new_uuid(),
            serial="0001",
            kind="sweep",
            started_at=now(),
            design_sha256=design.sha256,
            simulated=True,
        )
        began_s = time.perf_counter()
        begin(logbook, start, design)
        result = run_sweep(bench, schedule, keep=lambda point: logbook.add_point(start.uuid, point))
        logbook.end_sweep(start.uuid, "complete", "")
        took_s = time.perf_counter() - began_s
    assert result.state == "complete", result.why
    return took_s


def _bare(addresses: list[str], schedule: Schedule, waits: list[float]) -> float:
    """Return the seconds of the loop that a user would write: set, wait, read, read, remember."""
    manager = pyvisa.ResourceManager("@py")
    source, output, before = (
        manager.open_resource(address, read_termination="\n", write_termination="\n", timeout=5000)
        for address in addresses
    )
    gains = []
    began_s = time.perf_counter()
    source.query("*CLS\nOUTPut OFF\nOUTPut:LOAD INFinity\n*OPC?")  # type: ignore[attr-defined]
    for meter in (output, before):
        meter.query("CONFigure:VOLTage:AC\n*OPC?")  # type: ignore[attr-defined]
    source.query("OUTPut ON\n*OPC?")  # type: ignore[attr-defined]
    for step, wait_s in zip(schedule.steps, waits, strict=True):
        source.query(  # type: ignore[attr-defined]
            f"SOURce:FREQuency {step.frequency_hz}\nSOURce:VOLTage {step.level_vrms}\n*OPC?"
        )
        time.sleep(wait_s)
        level = float(before.query("READ?"))  # type: ignore[attr-defined]
        gains.append(float(output.query("READ?")) / level)  # type: ignore[attr-defined]
    source.query("OUTPut OFF\n*OPC?")  # type: ignore[attr-defined]
    took_s = time.perf_counter() - began_s
    for instrument in (source, output, before):
        instrument.close()
    return took_s


if __name__ == "__main__":
    main()
