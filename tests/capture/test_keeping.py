"""Layouts by name, serials out of file names, originals kept whole."""

import hashlib
from pathlib import Path

import pytest

from benchlog.capture.layout import read_layout, save_layout
from benchlog.capture.naming import by_serial, serial_of
from benchlog.capture.originals import keep_original, read_original
from benchlog.capture.read import Told
from benchlog.errors import CaptureError


def test_layout_comes_back_as_it_was_saved(tmp_path: Path) -> None:
    """Units with slashes and quotes too."""
    told = Told(units={"gain": "V/V", 'odd "name"': "dB"}, columns={"input": "CH1"})
    save_layout(tmp_path, "scope.1", told)

    again = read_layout(tmp_path, "scope.1")

    assert (again.units, again.columns) == (told.units, told.columns)


@pytest.mark.parametrize("name", ["", "../x", "a/b", ".hidden", "a" * 65, "a b"])
def test_layout_names_stay_in_their_folder(tmp_path: Path, name: str) -> None:
    """No path tricks."""
    with pytest.raises(CaptureError, match="is no name for a layout"):
        save_layout(tmp_path, name, Told())


def test_missing_and_wrong_layouts_are_told(tmp_path: Path) -> None:
    """With the file and the key."""
    with pytest.raises(CaptureError, match="the layout file cannot be read"):
        read_layout(tmp_path, "none")
    (tmp_path / "layouts").mkdir()
    (tmp_path / "layouts" / "bad.toml").write_text('unit = { gain = "dB" }')
    with pytest.raises(CaptureError) as refused:
        read_layout(tmp_path, "bad")
    assert refused.value.hint == "did you mean 'units'?"


@pytest.mark.parametrize(
    ("name", "pattern", "serial"),
    [
        ("x_0012.csv", "x_{serial}.csv", "0012"),
        ("2026-01-02 board 1E05 a.csv", "* board {serial} *.csv", "1E05"),
        ("0042_003.csv", "{serial}_*.csv", "0042"),
    ],
)
def test_serial_is_text_out_of_a_name(name: str, pattern: str, serial: str) -> None:
    """Leading zeros and exponents are letters here."""
    assert serial_of(Path("folder") / name, pattern) == serial


@pytest.mark.parametrize(
    ("name", "pattern"),
    [("a.csv", "b_{serial}.csv"), ("a.csv", "*.csv"), ("a", "{serial}{serial}")],
)
def test_names_that_do_not_fit_are_refused(name: str, pattern: str) -> None:
    """Nothing is guessed."""
    with pytest.raises(CaptureError):
        serial_of(Path(name), pattern)


def test_files_of_one_serial_stay_together() -> None:
    """In the order of their coming."""
    files = [Path("1_a.csv"), Path("2_a.csv"), Path("1_b.csv")]

    assert by_serial(files, "{serial}_*.csv") == {
        "1": [Path("1_a.csv"), Path("1_b.csv")],
        "2": [Path("2_a.csv")],
    }


def test_original_is_kept_whole_and_once(tmp_path: Path) -> None:
    """Under its hash; the same bytes again change nothing."""
    file = tmp_path / "capture.CSV"
    file.write_bytes(b"1,2\r\n" * 1000)
    kept = keep_original(file, tmp_path / "captures")
    before = kept.stat().st_mtime_ns

    assert kept.name == f"{hashlib.sha256(file.read_bytes()).hexdigest()}.csv.gz"
    assert read_original(kept) == file.read_bytes()
    assert keep_original(file, tmp_path / "captures") == kept
    assert kept.stat().st_mtime_ns == before
    assert [path.name for path in kept.parent.iterdir()] == [kept.name]


def test_original_that_cannot_be_kept_is_told(tmp_path: Path) -> None:
    """With the option that imports all the same."""
    file = tmp_path / "capture.csv"
    file.write_text("1,2\n")
    (tmp_path / "captures").write_text("a file where the folder should be")

    with pytest.raises(CaptureError) as refused:
        keep_original(file, tmp_path / "captures")

    assert "--no-original" in str(refused.value.hint)
