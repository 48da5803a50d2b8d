"""Time records in the shapes that instruments write, each to the board's own gain and phase."""

from pathlib import Path

import numpy as np
import pytest

from benchlog.capture.read import Told, inspect_captures
from benchlog.errors import CaptureError
from benchlog.records import PointFlag
from tests.fakes.records import CORNER_HZ, DIALECTS, GAIN, board, plain, samples


@pytest.mark.parametrize("dialect", DIALECTS)
def test_each_dialect_gives_the_board(tmp_path: Path, dialect: str) -> None:
    """Gain, phase and frequency from one file."""
    file = tmp_path / "capture.csv"
    file.write_text(DIALECTS[dialect](samples(40e3)), encoding="utf-8")

    (capture,) = inspect_captures([file])

    curve, truth = capture.curve, board(40e3)
    assert curve.phase_deg is not None
    # Rounded stamps lose a little of the record's length, and so of its frequency.
    loose = 3e-3 if dialect == "rounded_times" else 1e-6
    assert curve.frequency_hz[0] == pytest.approx(40e3, rel=loose)
    assert curve.gain[0] == pytest.approx(abs(truth), rel=1e-4)
    assert curve.phase_deg[0] == pytest.approx(np.degrees(np.angle(truth)), abs=0.02)


def test_folder_of_one_board_is_one_curve(tmp_path: Path) -> None:
    """Ten frequencies in ten files and as many dialects: gain and corner of the board."""
    from benchlog.extract.figures import extract

    frequencies = [200, 1e3, 5e3, 2e4, 4e4, 6e4, 1e5, 2e5, 4e5, 8e5]
    writers = list(DIALECTS.values())[:7]
    for place, frequency_hz in enumerate(frequencies):
        write = writers[place % len(writers)]
        (tmp_path / f"{place}.csv").write_text(write(samples(frequency_hz)), encoding="utf-8")

    (capture,) = inspect_captures([tmp_path])
    figures = extract(capture.curve)

    assert capture.curve.frequency_hz == pytest.approx(frequencies, rel=1e-5)
    assert figures.gain is not None
    assert figures.gain.value == pytest.approx(GAIN, rel=1e-4)
    assert figures.corner_hz is not None
    assert figures.corner_hz.value == pytest.approx(CORNER_HZ, rel=3e-4)


def test_segments_are_points_of_their_own(tmp_path: Path) -> None:
    """Time that starts anew starts a new record."""
    file = tmp_path / "segments.csv"
    first, second = plain(samples(2e3)), plain(samples(3e3))
    file.write_text(first + "".join(second.splitlines(keepends=True)[1:]))

    (capture,) = inspect_captures([file])

    assert capture.curve.frequency_hz == pytest.approx([2e3, 3e3], rel=1e-6)


def test_channels_without_names_are_asked_for(tmp_path: Path) -> None:
    """And taken by name or by place."""
    file = tmp_path / "capture.csv"
    file.write_text(plain(samples(1e3)).replace("Input", "CH1").replace("Output", "CH2"))

    with pytest.raises(CaptureError) as refused:
        inspect_captures([file])
    assert refused.value.what.startswith("it is not clear which channel")
    assert refused.value.hint == "say it: --column input=CH1 --column output=CH2"
    for sides in ({"input": "CH1", "output": "CH2"}, {"input": "1", "output": "2"}):
        (capture,) = inspect_captures([file], told=Told(columns=sides))
        assert capture.curve.gain[0] == pytest.approx(abs(board(1e3)), rel=1e-4)


def test_clipped_record_is_flagged(tmp_path: Path) -> None:
    """Flat tops: kept, flagged, and said."""
    time_s, before, after = samples(1e3)
    file = tmp_path / "clipped.csv"
    file.write_text(plain((time_s, before, np.clip(after, -0.1, 0.5))))

    (capture,) = inspect_captures([file])

    assert capture.curve.flags is not None
    flags = PointFlag(int(capture.curve.flags[0]))
    assert PointFlag.CLIPPED in flags
    assert PointFlag.DISTORTED in flags
    assert any("the output is clipped" in note for note in capture.notes)


def test_coarse_codes_are_not_taken_for_clipping(tmp_path: Path) -> None:
    """Eight bits have equal codes at every crest."""
    time_s, before, after = samples(1e3, count=4000, noise_rel=0.0)
    file = tmp_path / "coarse.csv"
    file.write_text(plain((time_s, np.round(before, 4), np.round(after / 0.004) * 0.004)))

    (capture,) = inspect_captures([file])

    assert capture.curve.usable.all(), capture.notes


@pytest.mark.parametrize(
    ("count", "cycles", "what"),
    [
        (1000, 0.5, "the record holds 0.5 cycles"),
        (1000, 450.0, "it may be aliased"),
    ],
    ids=["half a cycle", "two samples a cycle"],
)
def test_records_that_cannot_say(tmp_path: Path, count: int, cycles: float, what: str) -> None:
    """Refused with what to change."""
    file = tmp_path / "capture.csv"
    file.write_text(plain(samples(1e3, count=count, cycles=cycles)))

    with pytest.raises(CaptureError) as refused:
        inspect_captures([file])

    assert what in refused.value.what
    assert refused.value.hint
    assert str(file) in str(refused.value.where)


def test_record_without_times_or_interval_is_refused(tmp_path: Path) -> None:
    """Codes alone have no frequency."""
    file = tmp_path / "capture.csv"
    text = DIALECTS["codes"](samples(1e3)).replace("Time increment", "Something else")
    file.write_text(text)

    with pytest.raises(CaptureError):
        inspect_captures([file])


def test_samples_missing_in_the_middle_are_refused(tmp_path: Path) -> None:
    """With the line."""
    lines = plain(samples(1e3)).splitlines()
    lines[500] = lines[500].rsplit(",", 1)[0] + ",OVLD"
    file = tmp_path / "capture.csv"
    file.write_text("\n".join(lines))

    with pytest.raises(CaptureError) as refused:
        inspect_captures([file])

    assert refused.value.what == "samples are missing in the middle of the record"
    assert "line 501" in str(refused.value.where)


def test_preamble_beside_the_samples(tmp_path: Path) -> None:
    """Keys in the first columns of the same rows, blank once they end; the times are told."""
    keys = ["Record length,1000,,", "Operator,nobody,,", "Date,2026-01-01,,"]
    rows = zip(*samples(1e3), strict=True)
    lines = [
        f"{keys[place] if place < len(keys) else ',,,'}{t:.9e},{a:.7e},{b:.7e}"
        for place, (t, a, b) in enumerate(rows)
    ]
    file = tmp_path / "capture.csv"
    file.write_text("\n".join(lines) + "\n")

    told = Told(columns={"time": "1", "input": "1", "output": "2"})
    (capture,) = inspect_captures([file], told=told)

    assert capture.curve.frequency_hz[0] == pytest.approx(1e3, rel=1e-6)
    assert capture.curve.gain[0] == pytest.approx(abs(board(1e3)), rel=1e-4)


def test_blank_line_between_names_and_samples(tmp_path: Path) -> None:
    """And units in a row of their own, and times in another unit by the option."""
    text = DIALECTS["decimal_comma"](samples(1e3))
    spaced = text.replace("(us);(mV);(V)\n", "(us);(mV);(V)\n\n")
    file = tmp_path / "capture.csv"
    file.write_text(spaced, encoding="utf-8")
    bare = tmp_path / "bare.csv"
    bare.write_text(text.replace("(us);", ";"), encoding="utf-8")

    (first,) = inspect_captures([file])
    (second,) = inspect_captures([bare], told=Told(units={"time": "us"}))

    assert first.curve.frequency_hz == pytest.approx([1e3], rel=1e-6)
    assert second.curve.frequency_hz == pytest.approx([1e3], rel=1e-6)


def test_channels_of_one_name_are_told_by_place(tmp_path: Path) -> None:
    """Numbered channels over a row of units."""
    lines = plain(samples(1e3)).splitlines()
    file = tmp_path / "capture.csv"
    file.write_text("\n".join(["x-axis,1,2", "second,Volt,Volt", *lines[1:]]) + "\n")

    with pytest.raises(CaptureError) as refused:
        inspect_captures([file])
    (capture,) = inspect_captures([file], told=Told(columns={"input": "1", "output": "2"}))

    assert refused.value.hint == "say it: --column input=1 --column output=2"
    assert capture.curve.gain[0] == pytest.approx(abs(board(1e3)), rel=1e-4)


def test_record_of_overloads_is_refused(tmp_path: Path) -> None:
    """One channel that was never in range."""
    rows = "".join(f"{n}e-6,{n % 7},OVLD\n" for n in range(30))
    file = tmp_path / "capture.csv"
    file.write_text(f"Time (s),Input (V),Output (V)\n{rows}")

    with pytest.raises(CaptureError) as refused:
        inspect_captures([file])

    assert refused.value.what == "no row holds numbers for the times and both channels"
    assert str(refused.value.where).endswith("line 2 to line 31")


def test_overloads_of_a_channel_that_is_not_used_do_not_matter(tmp_path: Path) -> None:
    """A third channel, out of range now and then."""
    lines = plain(samples(1e3)).splitlines()
    third = [f"{line},{'OVLD' if place % 3 else place}" for place, line in enumerate(lines[1:])]
    file = tmp_path / "capture.csv"
    file.write_text("\n".join([f"{lines[0]},Supply (V)", *third]))

    (capture,) = inspect_captures([file])

    assert capture.notes == ()
    assert capture.curve.gain[0] == pytest.approx(abs(board(1e3)), rel=1e-4)
