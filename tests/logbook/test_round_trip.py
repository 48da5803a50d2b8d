"""Store, then load, gives the same record: laws by property."""

import math
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from dataclasses import replace

import msgspec
import pytest
from hypothesis import given, settings

from benchlog.errors import LogbookError
from benchlog.logbook.codec import from_json, json_object, to_json
from benchlog.logbook.store import Logbook
from benchlog.records import Figure, Figures, Point, SweepStart, Verdict
from tests.fakes.record_strategies import figure_sets, point_lists, starts, verdicts
from tests.fakes.sample_sweep import sample_figures, sample_start

# One file takes all examples: hypothesis makes a new UUID or a new row for each.
_SOME = settings(max_examples=40, deadline=None)


@pytest.fixture(scope="module")
def shared(
    tmp_path_factory: pytest.TempPathFactory, empty_logbook_bytes: bytes
) -> Iterator[Logbook]:
    """Return one logbook for all examples of this module."""
    path = tmp_path_factory.mktemp("round") / "logbook.db"
    path.write_bytes(empty_logbook_bytes)
    with Logbook(path) as opened:
        yield opened


class _Undo(Exception):  # noqa: N818 - ends an example
    """Leaves a block of ``together`` so that nothing is kept."""


@contextmanager
def _undone(logbook: Logbook) -> Iterator[None]:
    """Keep nothing of what the block writes, so that examples do not meet."""
    with suppress(_Undo), logbook.together():
        yield
        raise _Undo


@given(start=starts)
@_SOME
def test_a_start_comes_back_equal(shared: Logbook, start: SweepStart) -> None:
    """Every field, with instruments and type B terms (infinite degrees of freedom too)."""
    with _undone(shared):
        shared.begin_sweep(start)
        assert shared.sweep(start.uuid).start == start


@given(points=point_lists)
@_SOME
def test_points_come_back_equal(shared: Logbook, points: tuple[Point, ...]) -> None:
    """None stays None, flags stay flags, and every float keeps its last bit."""
    start = sample_start()
    with _undone(shared):
        shared.begin_sweep(start)
        shared.add_points(start.uuid, points)
        assert shared.points(start.uuid) == points


@given(figures=figure_sets, verdict=verdicts)
@_SOME
def test_figures_and_verdicts_come_back_equal(
    shared: Logbook, figures: Figures, verdict: Verdict
) -> None:
    """Bounds, reasons, term tables and infinite degrees of freedom survive."""
    start = sample_start()
    with _undone(shared):
        shared.begin_sweep(start)
        figures_id = shared.add_figures(start.uuid, figures)
        shared.add_verdict(figures_id, verdict, "budget")
        stored, given_verdict = (
            shared.latest_figures(start.uuid),
            shared.latest_verdict(start.uuid),
        )
        assert stored is not None
        assert stored.figures == figures
        assert given_verdict is not None
        assert given_verdict.verdict == verdict


def test_columns_of_figures_hold_what_the_record_holds(logbook: Logbook) -> None:
    """Queries over many sweeps see the same values, uncertainties and bounds."""
    start = sample_start()
    logbook.begin_sweep(start)
    logbook.add_figures(start.uuid, sample_figures(gain=48.25))
    row = logbook._connection.execute(
        "SELECT gain, u_gain, bound_gain, corner_hz, gbw_hz, u_gbw_hz, bound_gbw_hz, gain_db"
        " FROM figures"
    ).fetchone()
    assert row == (48.25, 0.02, None, 62e3, 2.9e6, None, "at least", None)


def test_stored_json_is_strict() -> None:
    """No token that a strict reader refuses: infinity is the text "inf"."""
    figures = Figures(gain=Figure(value=1.0, unit="V/V", u=0.1, dof=math.inf), shape="one-pole")
    body = to_json(figures, "figures")
    assert '"dof":"inf"' in body
    assert msgspec.json.decode(body)["gain"]["dof"] == "inf"
    assert from_json(body, Figures) == figures


def test_a_text_that_reads_like_infinity_stays_text() -> None:
    """Only a field that is a number takes "inf" for one."""
    figures = replace(sample_figures(), shape="inf", limited_by="null", chosen_because="1.5")
    assert from_json(to_json(figures, "figures"), Figures) == figures


def test_nan_is_refused_by_name() -> None:
    """NaN in a record is an error before it reaches the file."""
    wrong = replace(sample_figures(), shapes_tried=(("one-pole", math.nan),))
    with pytest.raises(LogbookError, match="a number in the figures is NaN"):
        to_json(wrong, "figures")


@pytest.mark.parametrize("body", ["{", "[1]", '{"a": NaN}', "null", ""])
def test_settings_must_be_a_json_object(body: str) -> None:
    """Settings that a strict reader could not read back are refused."""
    with pytest.raises(LogbookError, match="the settings are not a JSON object"):
        json_object(body, "settings")


def test_a_record_of_another_shape_is_said_so() -> None:
    """A row changed behind the tool's back gives one clear error."""
    with pytest.raises(LogbookError, match="a stored Verdict cannot be read"):
        from_json('{"overall": "splendid", "lines": []}', Verdict)
