"""What became of a board, found again by everything a person may ask for."""

from collections.abc import Iterator
from datetime import date

import pandas as pd
import pytest

from benchlog.errors import LogbookError
from benchlog.logbook.store import Logbook
from benchlog.records import InstrumentUsed
from tests.fakes.sample_sweep import (
    DESIGN_SHA256,
    DESIGN_TEXT,
    sample_figures,
    sample_points,
    sample_start,
    sample_verdict,
)

_OTHER_METER = InstrumentUsed(
    role="output meter", identity="invented,meter,M2,1.0", address="b", driver="meter_generic"
)

# Name of the sweep, its serial, start, verdict and what else differs from the sample.
_SWEEPS: list[tuple[str, str, str, str | None, dict[str, object]]] = [
    ("a", "0042", "2026-03-30T23:59:59.999+00:00", "fail", {"operator": "kim"}),
    ("b", "0043", "2026-03-31T00:00:00+00:00", "pass", {"operator": "lee", "lot": "L8"}),
    ("c", "0042", "2026-03-31T12:00:00+00:00", "pass", {"instruments": (_OTHER_METER,)}),
    ("d", "42", "2026-04-01T00:00:00+00:00", None, {"design_sha256": DESIGN_SHA256}),
    ("e", "0042", "2026-04-02T08:00:00.5+00:00", "conditional pass", {"simulated": True}),
]


@pytest.fixture(scope="module")
def filled(
    tmp_path_factory: pytest.TempPathFactory, empty_logbook_bytes: bytes
) -> Iterator[tuple[Logbook, dict[str, str]]]:
    """Return a logbook with the sweeps above, and the name of each UUID."""
    path = tmp_path_factory.mktemp("history") / "logbook.db"
    path.write_bytes(empty_logbook_bytes)
    called: dict[str, str] = {}
    with Logbook(path) as logbook:
        for name, serial, started_at, word, changes in _SWEEPS:
            start = sample_start(serial, started_at=started_at, **changes)
            called[start.uuid] = name
            text = DESIGN_TEXT if start.design_sha256 else None
            logbook.begin_sweep(
                start, design_text=text, design_name="line preamp", design_revision="C"
            )
            if word is not None:
                logbook.add_points(start.uuid, sample_points())
                logbook.end_sweep(start.uuid, "complete")
                figures_id = logbook.add_figures(start.uuid, sample_figures())
                logbook.add_verdict(figures_id, sample_verdict(word), "budget")
        yield logbook, called


_FILTERS: list[tuple[str, dict[str, object]]] = [
    ("abcde", {}),
    ("abcde", {"lot": None, "verdict": None, "limit": None}),
    ("ace", {"serial": "0042"}),
    ("d", {"serial": "42"}),
    ("", {"serial": "004"}),
    ("a", {"verdict": "fail"}),
    ("bc", {"verdict": "pass"}),
    ("b", {"lot": "L8"}),
    ("b", {"operator": "lee"}),
    ("c", {"instrument": "METER,M2"}),
    ("abde", {"instrument": "M1"}),
    ("abde", {"instrument": "source"}),
    ("", {"instrument": "%"}),
    ("d", {"design": "line preamp"}),
    ("d", {"design": DESIGN_SHA256[:6].upper()}),
    ("", {"design": DESIGN_SHA256[:5]}),
    ("bcde", {"since": "2026-03-31"}),
    ("ab", {"until": "2026-03-31T00:00:00+00:00"}),
    ("abc", {"until": date(2026, 3, 31)}),
    ("bc", {"since": "2026-03-31", "until": "2026-03-31"}),
    ("de", {"since": "2026-04-01T02:00:00+02:00"}),
    ("e", {"limit": 1}),
    ("ce", {"serial": "0042", "limit": 2}),
    ("", {"limit": 0}),
    ("c", {"serial": "0042", "verdict": "pass", "since": "2026-03-31"}),
]


@pytest.mark.parametrize(("expected", "filters"), _FILTERS)
def test_filters_find_the_sweeps_oldest_first(
    filled: tuple[Logbook, dict[str, str]], expected: str, filters: dict[str, str]
) -> None:
    """Each filter alone, and some together."""
    logbook, called = filled
    rows = logbook.history(**filters)  # type: ignore[arg-type]
    assert "".join(called[row.sweep] for row in rows) == expected


@pytest.mark.parametrize(
    ("filters", "said"),
    [
        ({"verdict": "good"}, "'good' is no verdict"),
        ({"since": "today"}, "since 'today' is not a date"),
        ({"until": "31/03/2026"}, "until '31/03/2026' is not a date"),
    ],
)
def test_a_filter_that_is_none_is_said_so(
    filled: tuple[Logbook, dict[str, str]], filters: dict[str, str], said: str
) -> None:
    """A slip must not look like a board without history."""
    with pytest.raises(LogbookError, match=said):
        filled[0].history(**filters)  # type: ignore[arg-type]


def test_an_unknown_filter_is_our_mistake(filled: tuple[Logbook, dict[str, str]]) -> None:
    """A filter that does not exist never silently lets all through."""
    with pytest.raises(TypeError, match="history has no filter colour"):
        filled[0].history(colour="red")  # type: ignore[call-arg]


def test_a_row_holds_the_whole_story(filled: tuple[Logbook, dict[str, str]]) -> None:
    """Board, bench, figures, verdict, and what is not there is None."""
    logbook, _ = filled
    last = logbook.history("0042")[-1]
    assert (last.state, last.simulated, last.operator, last.lot) == ("complete", True, "kim", "L7")
    assert last.figures == sample_figures()
    assert last.verdict == sample_verdict("conditional pass")
    assert last.design_name is None
    (unfinished,) = logbook.history("42")
    assert (unfinished.state, unfinished.ended_at) == ("unfinished", None)
    assert (unfinished.figures, unfinished.verdict) == (None, None)
    assert (unfinished.design_name, unfinished.design_revision) == ("line preamp", "C")
    assert unfinished.design_sha256 == DESIGN_SHA256


def test_a_frame_keeps_serials_as_text(filled: tuple[Logbook, dict[str, str]]) -> None:
    """One column for each figure, its u and its bound; times with their zone."""
    logbook, _ = filled
    frame = logbook.history_frame()
    assert frame["serial"].tolist() == ["0042", "0043", "0042", "42", "0042"]
    assert frame["verdict"].tolist()[:2] == ["fail", "pass"]
    assert frame["gain"].tolist()[0] == 48.0
    assert frame["u_corner_hz"].tolist()[0] == 300.0
    assert frame["bound_gbw_hz"].tolist()[0] == "at least"
    assert frame["gain"].isna().tolist() == [False, False, False, True, False]
    assert isinstance(frame["started_at"].dtype, pd.DatetimeTZDtype)
    assert logbook.history_frame("nobody").empty


def test_boards_are_listed_with_their_sweeps(filled: tuple[Logbook, dict[str, str]]) -> None:
    """A serial that differs by a zero is another board."""
    found = [(board.serial, board.sweeps) for board in filled[0].boards()]
    assert found == [("0042", 3), ("0043", 1), ("42", 1)]


def test_info_counts_what_is_there(filled: tuple[Logbook, dict[str, str]]) -> None:
    """Counts, unfinished sweeps, and the span of time."""
    logbook, called = filled
    info = logbook.info()
    assert (info.boards, info.sweeps, info.points, info.figures, info.verdicts) == (3, 5, 12, 4, 4)
    assert info.designs == 1
    assert [called[uuid] for uuid in info.unfinished] == ["d"]
    assert info.first_started_at == _SWEEPS[0][2]
    assert info.last_started_at == _SWEEPS[-1][2]
    assert info.size_bytes == logbook.path.stat().st_size
    assert info.program.startswith("benchlog ")


def test_points_of_unfinished_sweeps_are_counted_too(logbook: Logbook) -> None:
    """Ended sweeps know their count; the others are counted one by one."""
    for state in ("complete", None):
        start = sample_start()
        logbook.begin_sweep(start)
        logbook.add_points(start.uuid, sample_points(4))
        if state == "complete":
            logbook.end_sweep(start.uuid, state)
    assert logbook.info().points == 8


def test_a_sweep_is_found_by_the_start_of_its_uuid(
    filled: tuple[Logbook, dict[str, str]], logbook: Logbook
) -> None:
    """Enough of it, in small letters or capitals; never a wrong one."""
    filled_logbook, called = filled
    for uuid in called:
        assert filled_logbook.sweep(uuid[:13].upper()).start.uuid == uuid
    for wrong in ("", "zz", "%", "_", "0042"):
        with pytest.raises(LogbookError, match="the logbook has no sweep"):
            logbook.sweep(wrong)


def test_a_start_that_fits_two_sweeps_is_refused(logbook: Logbook) -> None:
    """The error names the sweeps it could mean."""
    for last in ("1", "2"):
        logbook.begin_sweep(sample_start(uuid=f"aaaaaaaa-0000-4000-8000-00000000000{last}"))
    with pytest.raises(LogbookError, match="more than one sweep starts with 'aaaa': aaaaaaaa-"):
        logbook.sweep("aaaa")
    assert logbook.sweep("aaaaaaaa-0000-4000-8000-000000000002").state == "unfinished"


def test_sweeps_of_a_serial_and_of_a_capture_are_found(logbook: Logbook) -> None:
    """Also the same bytes imported before."""
    sha256 = "cd" * 32
    start = sample_start(kind="capture", capture_sha256=sha256)
    logbook.begin_sweep(start)
    assert [found.start for found in logbook.captures(sha256)] == [start]
    assert [found.start for found in logbook.sweeps_of("0042")] == [start]
    assert logbook.captures("ef" * 32) == ()
    assert logbook.sweeps_of("0043") == ()


def test_judging_again_adds_and_the_newest_verdict_counts(logbook: Logbook) -> None:
    """The row shows the latest verdict with the figures it was given on; nothing is lost."""
    start = sample_start()
    logbook.begin_sweep(start)
    first = logbook.add_figures(start.uuid, sample_figures(47.0))
    second = logbook.add_figures(start.uuid, sample_figures(48.0))
    logbook.add_verdict(second, sample_verdict("pass"), "old limits")
    third = logbook.add_figures(start.uuid, sample_figures(49.0))
    (row,) = logbook.history()
    assert (row.figures_id, row.verdict) == (second, sample_verdict("pass"))
    logbook.add_verdict(first, sample_verdict("fail"), "new limits")
    (row,) = logbook.history()
    assert (row.figures_id, row.verdict) == (first, sample_verdict("fail"))
    assert row.figures == sample_figures(47.0)
    newest = logbook.latest_figures(start.uuid)
    assert newest is not None
    assert newest.id == third
    decided = logbook.latest_verdict(start.uuid)
    assert decided is not None
    assert (decided.figures_id, decided.budget_text) == (first, "new limits")
    assert logbook.history(verdict="pass") == ()
    assert logbook.info().verdicts == 2


@pytest.mark.parametrize(
    ("filters", "index"),
    [
        ({"serial": "0042", "verdict": "pass"}, "sweep_by_serial"),
        ({"design": "line preamp", "since": "2026-03-31"}, "sweep_by_design"),
        ({"lot": "L7"}, "sweep_by_lot"),
        ({"since": "2026-03-31"}, "sweep_by_time"),
        ({"instrument": "M1"}, "sweep_by_instrument"),
    ],
)
def test_history_is_answered_by_an_index(
    logbook: Logbook, filters: dict[str, str], index: str
) -> None:
    """At a million sweeps, none of the tables that grow with them is read from end to end."""
    seen: list[str] = []
    logbook._connection.set_trace_callback(seen.append)
    logbook.history(**filters)  # type: ignore[arg-type]
    logbook._connection.set_trace_callback(None)
    plan = logbook._connection.execute(f"EXPLAIN QUERY PLAN {seen[-1]}").fetchall()
    steps = [row[3] for row in plan]
    assert any(step.startswith("SEARCH") and index in step for step in steps)
    growing = {"s", "e", "v", "f", "judged", "given", "newest", "sweep_instrument"}
    assert [step for step in steps if step[:4] == "SCAN" and step.split()[1] in growing] == []
