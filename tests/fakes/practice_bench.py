"""Bench files and benches around the practice instruments."""

from collections.abc import Callable, Iterable
from contextlib import AbstractContextManager
from pathlib import Path

from benchlog.bench.setup import Bench, BenchSetup, Place, open_bench, read_bench
from benchlog.bench.stop import StopFlag
from benchlog.bench.wire import Wire
from benchlog.folders import data_folder
from benchlog.practice.bench import ROLES, Role
from benchlog.practice.board import PracticeBoard
from benchlog.practice.faults import Fault
from benchlog.practice.server import PracticeServer
from benchlog.practice.wire import PracticeWires
from benchlog.practice.world import PERFECT, World
from tests.fakes.practice_boards import PREAMP

NOMINAL = PracticeBoard(PREAMP, spread=False, label="nominal")


def perfect_world() -> World:
    """Return a table with the nominal board between instruments without errors."""
    return World(NOMINAL, quality=PERFECT)


def noisy_world() -> World:
    """Return a table with the nominal board between instruments as they are."""
    return World(NOMINAL, seed=7)


def write_bench(
    folder: Path, addresses: Iterable[str], *, timeout_s: float | None = None
) -> BenchSetup:
    """Write a bench file, and drivers of its own where timeouts are to be short; read it back.

    Args:
        folder: Where to.
        addresses: In the order of roles.
        timeout_s: Replaces every timeout of the generic drivers.
    """
    lines = ['name = "test bench"']
    for role, address in zip(ROLES, addresses, strict=True):
        kind = "source_generic" if role == "source" else "meter_generic"
        driver = kind if timeout_s is None else _hasty_driver(folder, kind, timeout_s)
        lines += [
            f"[{role.replace(' ', '_')}]",
            f'driver = "{driver}"',
            f'address = "{address}"',
        ]
    path = folder / "bench.toml"
    path.write_text("\n".join(lines), encoding="utf-8")
    return read_bench(path)


def bench_in_process(
    folder: Path, wires: PracticeWires, around: Callable[[Wire], Wire] = lambda wire: wire
) -> Bench:
    """Open a bench on wires in the same process; ``around`` wraps each of them."""
    setup = write_bench(folder, wires.addresses)
    roles: dict[str, Role] = dict(zip(wires.addresses, ROLES, strict=True))

    def opener(place: Place) -> Wire:
        return around(wires.open(roles[place.address]))

    return open_bench(setup, open_wire=opener, clock=wires.clock)


def bench_over_tcp(
    folder: Path,
    server: PracticeServer,
    *,
    timeout_s: float | None = None,
    stop: StopFlag | None = None,
) -> AbstractContextManager[Bench]:
    """Open a bench on a running practice server."""
    return open_bench(write_bench(folder, server.addresses, timeout_s=timeout_s), stop=stop)


def faults_at(role: Role, *faults: Fault) -> dict[Role, Iterable[Fault]]:
    """Return faults of one instrument."""
    return {role: faults}


def _hasty_driver(folder: Path, kind: str, timeout_s: float) -> str:
    text = (data_folder("drivers") / f"{kind}.toml").read_text(encoding="utf-8")
    lines = [
        f'timeout = "{timeout_s * 1e3:g} ms"' if line.startswith("timeout = ") else line
        for line in text.splitlines()
    ]
    path = folder / f"{kind}_hasty.toml"
    path.write_text("\n".join(lines), encoding="utf-8")
    return path.name
