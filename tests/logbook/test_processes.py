"""Several programs write into one logbook at once."""

import subprocess
import sys
from pathlib import Path

from benchlog.logbook.store import Logbook

_WRITER = """
import sys
from benchlog.logbook.store import Logbook
from tests.fakes.sample_sweep import sample_points, sample_start

path, serial, uuid = sys.argv[1:]
with Logbook(path, create=True) as logbook:
    logbook.begin_sweep(sample_start(serial, uuid=uuid))
    for point in sample_points(20):
        logbook.add_point(uuid, point)
    logbook.end_sweep(uuid, "complete")
"""


def test_two_programs_make_and_fill_one_logbook(tmp_path: Path) -> None:
    """Both start on no file at all; no row is lost and neither is refused."""
    path = tmp_path / "logbook.db"
    uuids = [f"{digit * 8}-0000-4000-8000-000000000000" for digit in "12"]
    writers = [
        subprocess.Popen(
            [sys.executable, "-c", _WRITER, str(path), f"000{number}", uuid],
            stderr=subprocess.PIPE,
            text=True,
            cwd=Path(__file__).parents[2],
        )
        for number, uuid in enumerate(uuids)
    ]
    for writer in writers:
        _, errors = writer.communicate(timeout=60)
        assert writer.returncode == 0, errors
    with Logbook(path) as logbook:
        info = logbook.info()
        assert (info.sweeps, info.points, info.unfinished) == (2, 40, ())
        for uuid in uuids:
            assert [point.position for point in logbook.points(uuid)] == list(range(20))
        assert logbook._connection.execute("PRAGMA integrity_check").fetchall() == [("ok",)]
