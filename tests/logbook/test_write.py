"""What may be written, in which order, and what is shared instead of written again."""

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest

from benchlog.errors import LogbookError, Misuse
from benchlog.logbook import names
from benchlog.logbook.store import Logbook
from benchlog.records import PointFlag
from tests.fakes.failing_connection import ImpatientConnection
from tests.fakes.sample_sweep import (
    DESIGN_SHA256,
    DESIGN_TEXT,
    sample_figures,
    sample_points,
    sample_start,
    sample_verdict,
)

if TYPE_CHECKING:
    from collections.abc import Callable

_UNKNOWN = "00000000-0000-4000-8000-000000000000"


def _count(logbook: Logbook, table: str) -> int:
    (count,) = logbook._connection.execute(f"SELECT count(*) FROM {table}").fetchone()
    return int(count)


def test_what_sweeps_share_is_written_once(logbook: Logbook) -> None:
    """Design, settings, terms and instruments of ten equal sweeps take the room of one."""
    for _ in range(10):
        start = sample_start(design_sha256=DESIGN_SHA256)
        logbook.begin_sweep(
            start, design_text=DESIGN_TEXT, design_name="line preamp", design_revision="C"
        )
    counts = {name: _count(logbook, name) for name in ("design", "document", "instrument")}
    assert counts == {"design": 1, "document": 2, "instrument": 2}
    assert _count(logbook, names.SWEEP_INSTRUMENT) == 20


def test_a_new_calibration_is_another_instrument_row(logbook: Logbook) -> None:
    """What an instrument was when a sweep began is frozen into that sweep."""
    first = sample_start()
    used = tuple(replace(one, calibration_due="2028-03-31") for one in first.instruments)
    second = sample_start(instruments=used)
    logbook.begin_sweep(first)
    logbook.begin_sweep(second)
    assert logbook.sweep(first.uuid).start.instruments == first.instruments
    assert logbook.sweep(second.uuid).start.instruments == used


def test_an_empty_due_date_is_not_a_missing_one(logbook: Logbook) -> None:
    """Two uses of an instrument that differ only there both come back as they were."""
    first, *_ = sample_start().instruments
    used = tuple(replace(first, calibration_due=due) for due in (None, "", None))
    start = sample_start(instruments=used)
    logbook.begin_sweep(start)
    assert logbook.sweep(start.uuid).start.instruments == used


def test_a_design_is_known_by_its_hash_afterwards(logbook: Logbook) -> None:
    """The text is given with the first sweep; later ones may name it only."""
    first, second = (sample_start(design_sha256=DESIGN_SHA256) for _ in range(2))
    with pytest.raises(LogbookError, match="the logbook has no design"):
        logbook.begin_sweep(first)
    assert logbook.info().sweeps == 0
    logbook.begin_sweep(
        first, design_text=DESIGN_TEXT, design_name="line preamp", design_revision="C"
    )
    logbook.begin_sweep(second)
    stored = logbook.sweep(second.uuid).design
    assert stored is not None
    assert (stored.name, stored.revision, stored.text) == ("line preamp", "C", DESIGN_TEXT)
    assert logbook.design(DESIGN_SHA256) == stored
    assert logbook.design("0" * 64) is None


def test_a_design_is_kept_only_under_its_own_hash(logbook: Logbook) -> None:
    """A verdict must never point at limits other than those it was given on."""
    start = sample_start(design_sha256=DESIGN_SHA256)
    with pytest.raises(LogbookError, match="'preamp' is not the one that its SHA-256 names"):
        logbook.begin_sweep(start, design_text=DESIGN_TEXT + "\n", design_name="preamp")
    assert logbook.info().designs == 0


def test_a_design_text_without_a_design_is_misuse(logbook: Logbook) -> None:
    """A text that no hash names would be lost."""
    with pytest.raises(Misuse, match="names no design"):
        logbook.begin_sweep(sample_start(), design_text=DESIGN_TEXT)


def test_a_sweep_begins_once(logbook: Logbook) -> None:
    """The same UUID is not taken twice."""
    start = sample_start()
    logbook.begin_sweep(start)
    with pytest.raises(LogbookError, match=r"refused a row \(UNIQUE constraint failed: sweep.uuid"):
        logbook.begin_sweep(start)


def test_unknown_sweeps_take_nothing(logbook: Logbook) -> None:
    """Points, ends and figures need a sweep, and verdicts need figures."""
    writes: list[Callable[[], object]] = [
        lambda: logbook.add_points(_UNKNOWN, sample_points()),
        lambda: logbook.end_sweep(_UNKNOWN, "complete"),
        lambda: logbook.add_figures(_UNKNOWN, sample_figures()),
    ]
    for write in writes:
        with pytest.raises(LogbookError, match=f"the logbook has no sweep {_UNKNOWN}"):
            write()
    with pytest.raises(LogbookError, match="the logbook has no figures number 7"):
        logbook.add_verdict(7, sample_verdict(), "budget")


def test_an_ended_sweep_takes_nothing_more(logbook: Logbook) -> None:
    """Neither points nor a second end; the error says how it ended."""
    start = sample_start()
    logbook.begin_sweep(start)
    logbook.end_sweep(start.uuid, "stopped", "by the operator")
    writes: list[Callable[[], object]] = [
        lambda: logbook.add_points(start.uuid, sample_points()),
        lambda: logbook.end_sweep(start.uuid, "complete"),
    ]
    for write in writes:
        with pytest.raises(LogbookError, match=r"has ended already \(stopped\)"):
            write()
    stored = logbook.sweep(start.uuid)
    assert (stored.state, stored.why) == ("stopped", "by the operator")
    assert stored.ended_at is not None


def test_a_position_is_measured_once_and_checked_often(logbook: Logbook) -> None:
    """Checks of a point are rows beside it, in the order in which they were made."""
    start = sample_start()
    first, second = sample_points(2)
    checks = [replace(first, kind="check", gain=gain) for gain in (47.1, 47.2, 47.3)]
    logbook.begin_sweep(start)
    logbook.add_points(start.uuid, [first, second])
    logbook.add_points(start.uuid, checks[:2])
    logbook.add_point(start.uuid, checks[2])
    with pytest.raises(LogbookError, match="refused a row"):
        logbook.add_point(start.uuid, first)
    assert logbook.points(start.uuid) == (first, *checks, second)
    assert len(logbook.curve(start.uuid)) == 2


def test_many_points_are_all_kept_or_none(logbook: Logbook) -> None:
    """One bad point in a capture leaves nothing of it."""
    start = sample_start()
    good = sample_points(5)
    logbook.begin_sweep(start)
    with pytest.raises(LogbookError, match="refused a row"):
        logbook.add_points(start.uuid, [*good, good[0]])
    assert logbook.points(start.uuid) == ()
    logbook.add_points(start.uuid, iter(good))
    assert logbook.points(start.uuid) == good


def test_together_keeps_all_or_nothing(logbook: Logbook) -> None:
    """A capture's start, points and end are one transaction; blocks do not nest."""
    start = sample_start(kind="capture")

    def keep(state: str) -> None:
        with logbook.together():
            logbook.begin_sweep(start)
            logbook.add_points(start.uuid, sample_points())
            logbook.end_sweep(start.uuid, state)  # type: ignore[arg-type]

    with pytest.raises(LogbookError, match="refused a row"):
        keep("finished")
    assert logbook.info().sweeps == 0
    keep("complete")
    assert logbook.info().points == 3
    with logbook.together(), pytest.raises(Misuse, match="already grouped"):
        logbook.together().__enter__()
    logbook.begin_sweep(sample_start())


def test_a_transaction_holds_the_file_from_its_beginning(logbook: Logbook) -> None:
    """A lock taken only at the first write could be refused at once, without waiting."""
    start = sample_start()
    with Logbook(logbook.path, factory=ImpatientConnection) as other:
        with logbook.together(), pytest.raises(LogbookError, match="in use by another program"):
            other.begin_sweep(start)
        other.begin_sweep(start)


def test_the_curve_carries_what_extraction_must_know(logbook: Logbook) -> None:
    """Reference, source resistance and type B terms come from the sweep's start."""
    start = sample_start(reference="programmed", source_ohm=50.0)
    first, second, third = sample_points()
    points = (
        first,
        replace(second, gain=None, output_vrms=None, flags=PointFlag.OVERLOAD, raw="9.9E37"),
        replace(third, flags=PointFlag.UNSETTLED),
    )
    logbook.begin_sweep(start)
    logbook.add_points(start.uuid, points)
    curve = logbook.curve(start.uuid)
    assert (curve.reference, curve.source_ohm, curve.terms) == ("programmed", 50.0, start.terms)
    assert curve.frequency_hz.tolist() == [first.frequency_hz, third.frequency_hz]
    assert curve.usable.tolist() == [True, False]


def test_a_verdict_names_the_design_whose_budget_it_used(logbook: Logbook) -> None:
    """By default the sweep's own; another only if the logbook knows its text."""
    start = sample_start()
    logbook.begin_sweep(start)
    figures_id = logbook.add_figures(start.uuid, sample_figures())
    logbook.add_verdict(figures_id, sample_verdict(), "budget")
    verdict = logbook.latest_verdict(start.uuid)
    assert verdict is not None
    assert verdict.design_sha256 is None
    with pytest.raises(LogbookError, match="the logbook has no design"):
        logbook.add_verdict(figures_id, sample_verdict(), "b", design_sha256=DESIGN_SHA256)
    logbook.add_design(DESIGN_TEXT, sha256=DESIGN_SHA256, name="line preamp", revision="C")
    logbook.add_verdict(figures_id, sample_verdict(), "b", design_sha256=DESIGN_SHA256)
    verdict = logbook.latest_verdict(start.uuid)
    assert verdict is not None
    assert verdict.design_sha256 == DESIGN_SHA256
    assert verdict.budget_text == "b"
