"""A real process over real sockets, killed or stopped in the middle of a sweep."""

import os
import random
import signal
import sqlite3
import subprocess
import sys
import threading
import time
from collections.abc import Iterator
from contextlib import closing
from pathlib import Path
from uuid import uuid4

import numpy as np
import pytest

from benchlog.logbook.store import Logbook
from benchlog.practice.server import PracticeServer
from tests.fakes.practice_bench import NOMINAL, perfect_world, write_bench
from tests.fakes.sweep_worker import SCHEDULE

pytestmark = pytest.mark.skipif(os.name != "posix", reason="needs fork and signals")
ROOT = Path(__file__).parents[2]
PATIENCE_S = 30.0


class Worker:
    """A running worker process and what it says."""

    def __init__(self, bench_file: Path) -> None:
        self.process = subprocess.Popen(
            [sys.executable, "-m", "tests.fakes.sweep_worker", str(bench_file)],
            cwd=ROOT,
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            text=True,
            bufsize=1,
        )

    def begin(self) -> tuple[str, int]:
        """Let it begin a sweep; return the sweep's name and the process that does it."""
        uuid = str(uuid4())
        assert self.process.stdin is not None
        self.process.stdin.write(f"{uuid}\n")
        self.process.stdin.flush()
        word, pid = self.hear()
        assert word == "pid"
        return uuid, int(pid)

    def hear(self) -> list[str]:
        """Return the words of its next line."""
        assert self.process.stdout is not None
        patience = threading.Timer(PATIENCE_S, self.process.kill)
        patience.start()
        line = self.process.stdout.readline()
        patience.cancel()
        assert line, "the worker has died"
        return line.split()

    def hear_until(self, *words: str) -> list[int]:
        """Return the positions it says it kept until a line starts with these words."""
        kept = []
        while (line := self.hear())[: len(words)] != [*words]:
            if line[0] == "kept":
                kept.append(int(line[1]))
        if line[0] == "kept":
            kept.append(int(line[1]))
        return kept

    def close(self) -> None:
        """End it."""
        self.process.kill()
        self.process.wait()
        for pipe in (self.process.stdin, self.process.stdout):
            if pipe is not None:
                pipe.close()


@pytest.fixture(scope="module")
def server() -> Iterator[PracticeServer]:
    """Run a practice bench without errors of its own."""
    with PracticeServer(perfect_world()) as running:
        yield running


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory, server: PracticeServer) -> Path:
    """Return a bench folder with an empty logbook."""
    made = tmp_path_factory.mktemp("bench")
    write_bench(made, server.addresses)
    Logbook(made / "logbook.db", create=True).close()
    return made


@pytest.fixture(scope="module")
def worker(folder: Path) -> Iterator[Worker]:
    """Run a worker process."""
    running = Worker(folder / "bench.toml")
    yield running
    running.close()


def assert_in_file(folder: Path, uuid: str, heard: list[int]) -> None:
    """Every point that was reported is in a sound file, and every point in it is right."""
    with closing(sqlite3.connect(folder / "logbook.db")) as connection:
        assert connection.execute("PRAGMA integrity_check").fetchall() == [("ok",)]
        assert connection.execute("PRAGMA foreign_key_check").fetchall() == []
    with Logbook(folder / "logbook.db") as logbook:
        points = logbook.points(uuid)
    assert [point.position for point in points] == [*range(len(points))]
    # One more may have been made durable before anybody could be told.
    assert len(heard) <= len(points) <= len(heard) + 1
    frequencies = np.array([point.frequency_hz for point in points])
    assert list(frequencies) == [step.frequency_hz for step in SCHEDULE.steps[: len(points)]]
    if len(points):
        gains = np.abs(NOMINAL.gain(frequencies))
        assert [point.gain for point in points] == pytest.approx(gains, rel=1e-3)


def kill_once(worker: Worker, folder: Path, chance: random.Random) -> None:
    """Begin a sweep, kill it without warning somewhere, and look at the file."""
    uuid, pid = worker.begin()
    heard = worker.hear_until("kept", str(chance.randrange(12)))
    time.sleep(chance.random() * 0.02)  # anywhere between two points
    os.kill(pid, signal.SIGKILL)
    heard += worker.hear_until("gone", str(int(signal.SIGKILL)))

    assert_in_file(folder, uuid, heard)
    with Logbook(folder / "logbook.db") as logbook:
        assert logbook.sweep(uuid).state == "unfinished"


@pytest.mark.parametrize("seed", range(3))
def test_kill_9(worker: Worker, folder: Path, seed: int) -> None:
    """Every point reported as read is in the file after kill -9; the sweep is unfinished."""
    kill_once(worker, folder, random.Random(seed))


@pytest.mark.long
def test_kill_9_again_and_again(worker: Worker, folder: Path) -> None:
    """The same 500 times, with one logbook that outlives it all."""
    chance = random.Random(500)
    for _ in range(500):
        kill_once(worker, folder, chance)


@pytest.mark.parametrize(
    ("signals", "exit_code"),
    [(["SIGINT"], 130), (["SIGTERM"], 143), (["SIGHUP"], 130), (["SIGINT", "SIGINT"], 130)],
    ids=["INT", "TERM", "HUP", "INT INT"],
)
def test_signals(
    worker: Worker, folder: Path, server: PracticeServer, signals: list[str], exit_code: int
) -> None:
    """A stopped sweep ends by itself: end row written, source off, kept points in the file."""
    uuid, pid = worker.begin()
    heard = worker.hear_until("kept", "3")
    assert server.world.drive.on
    for name in signals:
        os.kill(pid, signal.Signals[name])
        time.sleep(0.001)  # two signals at the same moment may arrive as one
    heard += worker.hear_until("end", "stopped", str(exit_code))
    assert not server.world.drive.on
    worker.hear_until("gone", "0")

    assert_in_file(folder, uuid, heard)
    with Logbook(folder / "logbook.db") as logbook:
        stored = logbook.sweep(uuid)
    assert stored.state == "stopped"
