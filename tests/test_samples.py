"""The samples are what their script writes, and go from file to verdict with one command each."""

from pathlib import Path

import pytest

from benchlog.capture.read import inspect_captures
from benchlog.design.read import read_design
from benchlog.extract.figures import extract
from benchlog.judge.verdict import judge
from tests.make_samples import ROOT, sample_files

SAMPLES = ROOT / "sample_data"


def test_samples_are_what_the_script_writes() -> None:
    """No file more, no file less: run ``python tests/make_samples.py`` after a change."""
    written = sample_files()
    there = {
        str(path.relative_to(SAMPLES)).replace("\\", "/"): path.read_text(encoding="utf-8")
        for path in SAMPLES.rglob("*")
        if path.is_file() and path.name != "ORIGIN.md"
    }

    assert there == written


@pytest.mark.parametrize("name", ["captures/table_0006.csv", "captures/board_0042"])
def test_sample_goes_from_file_to_verdict(name: str) -> None:
    """Against the sample design: both boards pass."""
    design = read_design(SAMPLES / "line_preamp.toml")

    (capture,) = inspect_captures([SAMPLES / name], design=design)
    verdict = judge(extract(capture.curve, design), design.budget)

    assert capture.notes == ()
    assert verdict.overall == "pass"


def test_origin_names_every_sample() -> None:
    """Nothing without a word on where it comes from."""
    origin = (SAMPLES / "ORIGIN.md").read_text(encoding="utf-8")

    for name in sample_files():
        assert name in origin or f"{Path(name).parent}/*.csv" in origin
