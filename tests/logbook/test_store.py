"""What goes into a logbook comes out again."""

from pathlib import Path

from benchlog.logbook.store import Logbook
from tests.fakes.sample_sweep import (
    DESIGN_SHA256,
    DESIGN_TEXT,
    sample_figures,
    sample_points,
    sample_start,
    sample_verdict,
)


def test_a_whole_sweep_is_kept_across_closing_and_opening(tmp_path: Path) -> None:
    """Start, points, end, figures and verdict are equal when the file is opened again."""
    path = tmp_path / "logbook.db"
    start = sample_start(design_sha256=DESIGN_SHA256)
    with Logbook(path, create=True) as logbook:
        logbook.begin_sweep(
            start, design_text=DESIGN_TEXT, design_name="line preamp", design_revision="C"
        )
        for point in sample_points():
            logbook.add_point(start.uuid, point)
        logbook.end_sweep(start.uuid, "complete")
        figures_id = logbook.add_figures(start.uuid, sample_figures(), '{"shape": "auto"}')
        logbook.add_verdict(figures_id, sample_verdict(), "[budget]")
    with Logbook(path) as logbook:
        stored = logbook.sweep(start.uuid)
        figures = logbook.latest_figures(start.uuid)
        verdict = logbook.latest_verdict(start.uuid)
        assert stored.start == start
        assert stored.state == "complete"
        assert stored.design is not None
        assert stored.design.text == DESIGN_TEXT
        assert logbook.points(start.uuid) == sample_points()
        assert figures is not None
        assert figures.figures == sample_figures()
        assert verdict is not None
        assert verdict.verdict == sample_verdict()
        assert verdict.design_sha256 == DESIGN_SHA256
