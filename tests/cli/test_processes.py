"""Real processes: the demo, a practice bench in one and a sweep in another, Ctrl-C and SIGTERM."""

import json
import re
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest

from benchlog.cli.new import bench_text, make_folder
from benchlog.logbook.store import Logbook

BENCHLOG = [sys.executable, "-m", "benchlog"]


@contextmanager
def practice() -> Iterator[tuple[int, int, int]]:
    """Yield the ports of a practice bench that runs in a process of its own."""
    with subprocess.Popen(
        [*BENCHLOG, "bench", "practice", "--port", "0"],
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
        text=True,
    ) as process:
        assert process.stdout is not None
        said = [process.stdout.readline() for _ in range(5)]
        source, output, before = (
            int(port) for port in re.findall(r"::(\d+)::SOCKET", "".join(said))
        )
        try:
            yield source, output, before
        finally:
            process.terminate()
            process.communicate()


def test_demo_keeps_its_promises(tmp_path: Path) -> None:
    """Five boards: pass, pass, fail (gain), fail (GBW), conditional; all simulated."""
    done = subprocess.run(
        [*BENCHLOG, "demo", "--json"], cwd=tmp_path, capture_output=True, text=True, check=False
    )

    assert done.returncode == 0, done.stderr
    boards = json.loads(done.stdout)
    words = [board["verdict"]["overall"] for board in boards]
    assert words[:4] == ["pass", "pass", "fail", "fail"]
    assert words[4].startswith("conditional")
    failed = [
        {line["figure"] for line in board["verdict"]["lines"] if line["verdict"] == "fail"}
        for board in boards
    ]
    assert failed == [set(), set(), {"gain_db"}, {"gbw_hz"}, set()]
    assert all(board["simulated"] and board["state"] == "complete" for board in boards)
    assert (tmp_path / "benchlog-demo" / "logbook.db").exists()


@pytest.mark.skipif(sys.platform == "win32", reason="Windows has no such signals")
@pytest.mark.parametrize(
    ("number", "code"), [(signal.SIGINT, 130), (signal.SIGTERM, 143)], ids=["Ctrl-C", "SIGTERM"]
)
def test_stopped_sweep_keeps_its_points(tmp_path: Path, number: signal.Signals, code: int) -> None:
    """Exit code, end row, and every point that was read."""
    folder = tmp_path / "bench"
    with practice() as ports:
        make_folder(folder, bench_text(ports))
        with subprocess.Popen(
            [*BENCHLOG, "-C", str(folder), "sweep", "0001"],
            stdin=subprocess.DEVNULL,
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            text=True,
        ) as process:
            assert process.stderr is not None
            while "12/46" not in process.stderr.readline():
                assert process.poll() is None
            process.send_signal(number)
            process.communicate()
    assert process.returncode == code
    with Logbook(folder / "logbook.db", read_only=True) as logbook:
        row = logbook.history("0001")[0]
        assert row.state == "stopped"
        assert len(logbook.points(row.sweep)) >= 12


def test_reader_that_goes_away_is_no_error(tmp_path: Path) -> None:
    """``benchlog ... | head -1``."""
    began_s = time.monotonic()
    done = subprocess.run(
        f"{' '.join(BENCHLOG)} --help | head -1",
        shell=True,
        cwd=tmp_path,
        capture_output=True,
        text=True,
        check=False,
    )

    assert done.stderr == ""
    assert time.monotonic() - began_s < 60
