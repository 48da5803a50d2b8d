"""``benchlog import``: from a CSV file to a verdict with one command."""

from pathlib import Path

import pytest

from benchlog.capture.example import example_capture
from benchlog.cli.new import bench_text, make_folder
from benchlog.logbook.store import Logbook
from tests.cli.conftest import Run


@pytest.fixture
def home(tmp_path: Path) -> Path:
    """Return a bench folder with a capture in it."""
    folder = tmp_path / "bench"
    make_folder(folder, bench_text())
    (folder / "capture.csv").write_text(example_capture(), encoding="utf-8")
    return folder


def test_capture_becomes_a_judged_sweep(run: Run, home: Path) -> None:
    """The example was made with a gain of 47.8 and a corner of 60.1 kHz."""
    ran = run("-C", home, "import", home / "capture.csv", "--serial", "0006", "--json")

    board = ran.data[0]
    assert ran.code == 0
    assert board["figures"]["gain"]["value"] == pytest.approx(47.8, rel=5e-4)
    assert board["figures"]["corner_hz"]["value"] == pytest.approx(60.1e3, rel=1e-3)
    assert board["verdict"]["overall"] == "pass"
    assert board["simulated"] is False
    with Logbook(home / "logbook.db", read_only=True) as logbook:
        assert logbook.history("0006")[0].kind == "capture"


def test_same_file_twice_is_refused_unless_asked(run: Run, home: Path) -> None:
    """By the hash of its bytes."""
    file = home / "capture.csv"
    assert run("-C", home, "import", file, "--serial", "0006").code == 0

    again = run("-C", home, "import", file, "--serial", "0007")
    assert again.code == 1
    assert "is in the logbook already, as serial 0006" in again.err
    assert run("-C", home, "import", file, "--serial", "0006", "--again").code == 0


def test_preview_keeps_nothing(run: Run, home: Path) -> None:
    """It shows what was understood and what it would come to."""
    ran = run("-C", home, "import", home / "capture.csv", "--preview")

    assert ran.code == 0
    for words in ("semicolon", "Frequency (Hz)", "verdict: PASS", "preview: nothing was kept"):
        assert words in ran.out
    with Logbook(home / "logbook.db", read_only=True) as logbook:
        assert logbook.info().sweeps == 0


def test_unit_is_asked_for_and_taken(run: Run, home: Path) -> None:
    """Never guessed."""
    rows = "\n".join(f"{10 ** (2 + i / 10):.6g};{40 - i / 10:.3f}" for i in range(30))
    (home / "plain.csv").write_text(f"Frequency (Hz);Gain\n{rows}\n")

    refused = run("-C", home, "import", home / "plain.csv", "--serial", "1")
    assert refused.code == 1
    assert "--unit gain=V/V" in refused.err
    taken = run("-C", home, "import", home / "plain.csv", "--serial", "1", "--unit", "gain=dB")
    assert taken.code in {3, 4}


def test_without_a_design_there_are_figures_but_no_verdict(run: Run, tmp_path: Path) -> None:
    """GBW is then gain times corner, and the record says so."""
    (tmp_path / "capture.csv").write_text(example_capture(), encoding="utf-8")
    ran = run("-C", tmp_path, "import", tmp_path / "capture.csv", "--serial", "6", "--json")

    board = ran.data[0]
    assert ran.code == 0
    assert board["verdict"] is None
    assert board["design"] is None
    assert board["figures"]["gbw_hz"]["basis"] == "signal gain"


def test_folder_of_records_is_one_sweep(run: Run, tmp_path: Path) -> None:
    """From a folder to a verdict with one command; originals are kept, and can be declined."""
    samples = Path(__file__).parents[2] / "sample_data"
    design, board = samples / "line_preamp.toml", samples / "captures" / "board_0042"

    ran = run("-C", tmp_path, "import", board, "--serial", "0042", "--design", design, "--json")

    (sweep,) = ran.data
    assert ran.code == 0
    assert sweep["verdict"]["overall"] == "pass"
    assert sweep["figures"]["corner_hz"]["value"] == pytest.approx(62.5e3, rel=1e-4)
    assert len(list((tmp_path / "captures").iterdir())) == 10
    again = run("-C", tmp_path, "import", board, "--serial", "0042", "--design", design)
    assert again.code == 1
    assert "is in the logbook already" in again.err


def test_batch_takes_serials_from_names(run: Run, home: Path) -> None:
    """Each board its own sweep; the pattern is checked, and a preview keeps nothing."""
    batch = home / "batch"
    batch.mkdir()
    for serial, end in (("0012", ""), ("1E05", "\n")):
        (batch / f"x_{serial}.csv").write_text(example_capture() + end, encoding="utf-8")

    shown = run("-C", home, "import", batch, "--serial-from-name", "x_{serial}.csv", "--preview")
    kept = run("-C", home, "import", batch, "--serial-from-name", "x_{serial}.csv", "--json")

    assert "serial       0012" in shown.out
    assert [board["serial"] for board in kept.data] == ["0012", "1E05"]
    wrong = run("-C", home, "import", batch, "--serial-from-name", "y_{serial}.csv")
    assert wrong.code == 1
    assert "does not fit the pattern" in wrong.err


def test_layout_is_kept_and_used(run: Run, home: Path) -> None:
    """What was said once need not be said again; originals stay out when told."""
    rows = "\n".join(f"{10 ** (2 + i / 10):.6g};{48 - i / 100:.3f}" for i in range(30))
    (home / "plain.csv").write_text(f"Frequency (Hz);Gain\n{rows}\n")
    said = ("--unit", "gain=V/V", "--save-layout", "lab", "--no-original")

    first = run("-C", home, "import", home / "plain.csv", "--serial", "1", *said)
    second = run("-C", home, "import", home / "plain.csv", "--serial", "1", "--layout", "lab",
                 "--again", "--no-original")  # fmt: skip

    assert first.code == second.code == 4
    assert not (home / "captures").exists()


def test_terminal_is_asked_before_anything_is_kept(
    run: Run, home: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Preview, serial, keep it? No keeps nothing."""
    answers = iter(["0006", "n"])
    monkeypatch.setattr("sys.stdin.isatty", lambda: True, raising=False)
    monkeypatch.setattr("click.termui.visible_prompt_func", lambda _: next(answers))

    ran = run("-C", home, "import", home / "capture.csv")

    assert ran.code == 130
    assert "not given yet" in ran.out
    with Logbook(home / "logbook.db", read_only=True) as logbook:
        assert logbook.info().sweeps == 0
