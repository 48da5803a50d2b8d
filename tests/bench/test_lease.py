"""One user of an instrument at a time, across processes and after crashes."""

import subprocess
import sys
from pathlib import Path

import pytest

from benchlog.bench import lease as lease_module
from benchlog.bench.lease import Lease
from benchlog.errors import LinkRefused

pytestmark = pytest.mark.skipif(sys.platform == "win32", reason="locks are VISA's there")
ADDRESS = "TCPIP::127.0.0.1::59999::SOCKET"


@pytest.fixture(autouse=True)
def own_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Keep the tests' leases away from real ones."""
    monkeypatch.setattr(lease_module, "_FOLDER", tmp_path / "leases")


def test_second_user_is_told_who_has_it() -> None:
    """With the process and since when; given back, it is free."""
    first = Lease([ADDRESS])
    with pytest.raises(LinkRefused) as refused:
        Lease(["USB0::1::2::3::INSTR", ADDRESS.lower()])
    assert "in use by process" in refused.value.what
    assert "since" in refused.value.what
    # What the second one had taken before it met the first is free again.
    Lease(["USB0::1::2::3::INSTR"]).close()
    first.close()
    first.close()

    Lease([ADDRESS]).close()


def test_crash_of_the_holder_leaves_nothing_behind(tmp_path: Path) -> None:
    """The system lets go of the lock with the process."""
    program = (
        "import os, pathlib, benchlog.bench.lease as m\n"
        f"m._FOLDER = pathlib.Path({str(tmp_path / 'leases')!r})\n"
        f"held = m.Lease([{ADDRESS!r}])\n"
        "os.abort()\n"
    )
    subprocess.run([sys.executable, "-c", program], capture_output=True, check=False)

    Lease([ADDRESS]).close()
