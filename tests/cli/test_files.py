"""``new``, ``driver``, ``design``: files made, listed, checked and shown; README kept true."""

from pathlib import Path

import pytest

from benchlog.cli.new import bench_text
from benchlog.design.example import EXAMPLE_DESIGN
from tests.cli.conftest import Run

README = (Path(__file__).parents[2] / "README.md").read_text(encoding="utf-8")


def test_new_folder_is_ready_and_never_overwritten(run: Run, tmp_path: Path) -> None:
    """Bench file, design, logbook; a second time is refused."""
    folder = tmp_path / "mine"

    assert run("new", folder).code == 0
    assert sorted(path.name for path in folder.iterdir()) == [
        "bench.toml", "design.toml", "logbook.db",
    ]  # fmt: skip
    again = run("new", folder)
    assert again.code == 1
    assert "nothing was changed" in again.err


@pytest.mark.parametrize("text", [EXAMPLE_DESIGN, bench_text()], ids=["design", "bench"])
def test_readme_shows_the_files_that_new_writes(text: str) -> None:
    """Word for word."""
    assert text in README


def test_drivers_are_listed_and_pass_their_examples(run: Run) -> None:
    """Both shipped drivers, for people and scripts."""
    listed = run("driver", "list", "--json").data

    assert [driver["name"] for driver in listed] == ["meter_generic", "source_generic"]
    assert "AC voltmeter" in run("driver", "list").out
    for driver in listed:
        checked = run("driver", "check", driver["name"])
        assert checked.code == 0
        assert "FAIL" not in checked.out


def test_driver_that_does_not_do_what_its_example_says(run: Run, tmp_path: Path) -> None:
    """Expected and got, and exit code 1."""
    from benchlog.folders import data_folder

    text = (data_folder("drivers") / "meter_generic.toml").read_text(encoding="utf-8")
    wrong = tmp_path / "mine.toml"
    wrong.write_text(text.replace("means = 0.339411255", "means = 0.4"))

    ran = run("driver", "check", wrong)

    assert ran.code == 1
    assert "expected: '0.4'" in ran.out
    assert any(not row["passed"] for row in run("driver", "check", wrong, "--json").data)


def test_design_show_predicts_by_noise_gain(run: Run, tmp_path: Path) -> None:
    """3 MHz through 48 is 62.5 kHz."""
    file = tmp_path / "design.toml"
    file.write_text(EXAMPLE_DESIGN)

    data = run("design", "show", file, "--json").data

    assert data["noise_gain"] == pytest.approx(48.0)
    assert data["corner_hz"] == pytest.approx(62.5e3, rel=1e-3)
    shown = run("design", "show", file).out
    for words in ("62.51 kHz", "output swing of stage 1", "four-state"):
        assert words in shown
