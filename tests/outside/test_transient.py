"""Time records that a circuit simulator computed, against the AC analysis of the same circuit.

Source:
    ngspice, transient analysis of ``netlists/transient/non_inverting_transient.cir`` (at most
    1/500 of a period a step, 8 periods after 24 of settling), its output committed, beside the AC
    analysis of ``netlists/non_inverting.cir``.
"""

import shutil
import subprocess
from pathlib import Path

import numpy as np
import pytest

from benchlog.capture.read import inspect_captures
from benchlog.curve import GainCurve
from benchlog.extract.figures import extract

NETLISTS = Path(__file__).parent / "netlists"
RECORDS = NETLISTS / "transient"
NETLIST = "non_inverting_transient.cir"


def as_captures(folder: Path, to: Path) -> None:
    """Write a simulator's output files as captures: the same numbers under a header."""
    for file in folder.glob("record_*.out"):
        text = "t1 input t2 output\n" + file.read_text(encoding="utf-8")
        (to / f"{file.stem}.csv").write_text(text, encoding="utf-8")


def test_records_give_the_figures_of_the_ac_analysis(tmp_path: Path) -> None:
    """Gain and corner within 0.5 %; each point's gain too."""
    as_captures(RECORDS, tmp_path)
    columns = np.loadtxt(NETLISTS / "non_inverting.out")
    frequency_hz, gain = columns[:, 0], np.hypot(columns[:, 1], columns[:, 3])

    (capture,) = inspect_captures([tmp_path])
    by_time, by_ac = extract(capture.curve), extract(GainCurve(frequency_hz, gain))

    curve = capture.curve
    truth = np.exp(np.interp(np.log(curve.frequency_hz), np.log(frequency_hz), np.log(gain)))
    assert len(curve) == 10
    assert curve.gain == pytest.approx(truth, rel=5e-3)
    for name in ("gain", "corner_hz"):
        one, other = by_time.figure(name), by_ac.figure(name)
        assert one is not None, by_time.validity
        assert other is not None, by_ac.validity
        assert one.value == pytest.approx(other.value, rel=5e-3)


@pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is not installed")
def test_simulator_still_says_so(tmp_path: Path) -> None:
    """The committed records are what the netlist gives."""
    shutil.copy(RECORDS / NETLIST, tmp_path)
    subprocess.run(["ngspice", "-b", NETLIST], cwd=tmp_path, capture_output=True, check=False)

    for file in RECORDS.glob("record_*.out"):
        again, committed = np.loadtxt(tmp_path / file.name), np.loadtxt(file)
        scale = np.abs(committed[:, 3]).max()
        assert np.abs(again[:, 3] - committed[:, 3]).max() < 1e-3 * scale
