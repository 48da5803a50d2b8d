"""Large records: the same answers from sums over blocks, and from a file read in chunks."""

from pathlib import Path

import numpy as np
import pytest

from benchlog.capture import stream
from benchlog.capture.longfit import fit_long
from benchlog.capture.read import inspect_captures
from benchlog.capture.sinefit import fit_common
from benchlog.errors import CaptureError
from tests.fakes.records import board, decimal_comma, interval_in_preamble, plain, samples


@pytest.mark.parametrize("count", [65_536, 70_001, 300_000])
def test_block_sums_give_the_whole_fit(count: int) -> None:
    """Against the fit that holds every sample, in all its numbers."""
    n = np.arange(count, dtype=np.float64)
    random = np.random.default_rng(count)
    angle = 2 * np.pi * 0.0123456 * n
    clean = np.stack([np.cos(angle + 0.3), 5 * np.cos(angle - 1.0) + 1.0])
    kept = (clean + 0.01 * random.standard_normal((2, count))).astype(np.float32)

    long, whole = fit_long(1.0, kept), fit_common(n, kept.astype(np.float64), 0.0123456)

    assert long.frequency_hz == pytest.approx(whole.frequency_hz, abs=1e-3 * whole.u_frequency_hz)
    assert long.u_frequency_hz == pytest.approx(whole.u_frequency_hz, rel=1e-3)
    for name in ("amplitude", "phase_rad", "offset", "u_amplitude", "u_phase_rad", "residual_rms"):
        assert getattr(long, name) == pytest.approx(getattr(whole, name), rel=1e-4), name


@pytest.mark.parametrize("write", [plain, decimal_comma, interval_in_preamble])
def test_streamed_file_gives_what_reading_it_whole_gives(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, write: object
) -> None:
    """With a cut last row and a footer, hash and all."""
    assert callable(write)
    text = write(samples(10e3, count=70_000, cycles=500.0))
    file = tmp_path / "large.csv"
    file.write_text(text + "1.2E-\nend of capture\n", encoding="utf-8")
    (whole,) = inspect_captures([file])
    monkeypatch.setattr("benchlog.capture.read.STREAM_FROM_BYTES", 1000)

    (streamed,) = inspect_captures([file])

    assert streamed.sha256 == whole.sha256
    assert streamed.curve.frequency_hz == pytest.approx(whole.curve.frequency_hz, rel=1e-9)
    assert streamed.curve.gain == pytest.approx(whole.curve.gain, rel=1e-6)
    assert streamed.curve.gain[0] == pytest.approx(abs(board(10e3)), rel=1e-4)
    assert streamed.curve.u_gain_rel == pytest.approx(whole.curve.u_gain_rel, rel=1e-3)
    assert streamed.curve.phase_deg == pytest.approx(whole.curve.phase_deg, abs=1e-4)


def test_bad_row_far_down_is_told_with_its_whereabouts(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Never a silent gap."""
    lines = plain(samples(10e3, count=70_000, cycles=500.0)).splitlines()
    lines[40_000] = "1.0,OVLD,2.0"
    file = tmp_path / "large.csv"
    file.write_text("\n".join(lines) + "\n")
    monkeypatch.setattr("benchlog.capture.read.STREAM_FROM_BYTES", 1000)

    with pytest.raises(CaptureError) as refused:
        inspect_captures([file])

    assert refused.value.what.startswith("a row is not numbers")
    assert "between line" in str(refused.value.where)


def test_large_file_that_is_no_record_is_refused(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Swept tables are never that large."""
    file = tmp_path / "large.csv"
    file.write_text("frequency_hz,gain\n" + "1,2\n" * 9000)
    monkeypatch.setattr("benchlog.capture.read.STREAM_FROM_BYTES", 1000)

    with pytest.raises(CaptureError, match="it is no time record"):
        inspect_captures([file])


def test_progress_runs_to_the_end(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """From a little to all."""
    from benchlog.capture.read import Told

    file = tmp_path / "large.csv"
    file.write_text(plain(samples(10e3, count=70_000, cycles=500.0)))
    monkeypatch.setattr("benchlog.capture.read.STREAM_FROM_BYTES", 1000)
    seen: list[float] = []

    inspect_captures([file], told=Told(progress=seen.append))

    assert seen == sorted(seen)
    assert seen[-1] == pytest.approx(1.0)
    assert stream.STREAM_FROM_BYTES == 16_000_000
