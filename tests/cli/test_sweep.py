"""``benchlog sweep`` over real sockets, and what can be asked afterwards."""

from pathlib import Path

import pytest

from benchlog.design.example import EXAMPLE_DESIGN
from benchlog.design.read import parse_design
from benchlog.logbook.store import Logbook
from benchlog.practice.board import PracticeBoard
from benchlog.practice.server import PracticeServer
from tests.cli.conftest import Run

DESIGN = parse_design(EXAMPLE_DESIGN, where="example")
FIGURES = {"gain", "gain_db", "corner_hz", "lower_corner_hz", "bandwidth_hz", "gbw_hz",
           "peaking_db", "peaking_hz", "unity_hz"}  # fmt: skip


def test_two_boards_from_source_to_verdict(run: Run, folder: Path) -> None:
    """JSON as the README describes it; the figures are those of the board on the table."""
    ran = run("-C", folder, "sweep", "0001", "0002", "--json", "--operator", "ann")

    assert ran.code == 0
    assert [board["serial"] for board in ran.data] == ["0001", "0002"]
    board = ran.data[0]
    assert (board["state"], board["simulated"]) == ("complete", True)
    assert board["design"]["name"] == "line preamp"
    assert set(board["figures"]) == FIGURES
    # 3 MHz through a noise gain of 48, as any textbook has it: 62.5 kHz.
    corner = board["figures"]["corner_hz"]
    assert abs(corner["value"] - 62.5e3) < 3 * corner["u"] + 100
    assert board["figures"]["gbw_hz"]["basis"] == "design"
    assert board["verdict"]["overall"] == "pass"
    assert {line["figure"] for line in board["verdict"]["lines"]} == {
        "gain_db", "corner_hz", "gbw_hz", "peaking_db",
    }  # fmt: skip
    assert "at most 7.071 mVrms" in ran.err


def test_verdict_for_people_is_large_and_in_words(run: Run, folder: Path) -> None:
    """Word, mark, serial, picture, and the rule that was used."""
    ran = run("-C", folder, "sweep", "0001")

    assert ran.code == 0
    for words in (
        "[ OK ] PASS   serial 0001",
        "SIMULATED",
        "#### ",
        "four-state, guard band 1 U",
        "-3 dB",
    ):
        assert words in ran.out


def test_failed_board_is_exit_code_3(run: Run, folder: Path, server: PracticeServer) -> None:
    """And its history says so."""
    wrong = PracticeBoard(DESIGN, spread=False, changes={"stage[1].ground": 1200.0})
    server.put_board(wrong)

    assert run("-C", folder, "sweep", "7").code == 3
    history = run("-C", folder, "history", "7", "--json")
    assert history.code == 0
    assert history.data[0]["verdict"]["overall"] == "fail"


def test_sweep_that_ends_too_early_is_invalid_and_exit_code_4(run: Run, folder: Path) -> None:
    """A bound and a reason instead of a corner."""
    ran = run("-C", folder, "sweep", "0001", "--stop", "20k", "--json")

    board = ran.data[0]
    assert ran.code == 4
    assert board["verdict"]["overall"] == "invalid"
    assert board["figures"]["corner_hz"]["bound"] == "at least"
    assert board["figures"]["corner_hz"]["u"] is None
    assert board["figures"]["gbw_hz"] is None or board["figures"]["gbw_hz"]["bound"]
    assert "corner above the sweep" in [reason["code"] for reason in board["validity"]]


def test_dry_run_opens_nothing(run: Run, folder: Path, server: PracticeServer) -> None:
    """The schedule is printed, and the logbook stays empty."""
    del server
    ran = run("-C", folder, "sweep", "0001", "--dry-run")

    assert ran.code == 0
    assert "Dry run: nothing was opened." in ran.out
    with Logbook(folder / "logbook.db", read_only=True) as logbook:
        assert logbook.info().sweeps == 0
    assert len(run("-C", folder, "sweep", "--dry-run", "--json").data) == 16


def test_too_high_a_level_is_refused_before_anything_is_opened(run: Run, folder: Path) -> None:
    """DESIGN limits, and the flag that lifts them is named."""
    ran = run("-C", folder, "sweep", "0001", "--level", "2 Vpp")

    assert ran.code == 1
    assert "more than this design bears" in ran.err


def test_scanning_one_board_after_another(
    run: Run, folder: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Scan, Enter, verdict, next; a bad scan is asked again; an empty line ends."""
    typed = iter(["  0001\t", "\a", "0002", ""])
    monkeypatch.setattr("sys.stdin.isatty", lambda: True, raising=False)
    monkeypatch.setattr("builtins.input", lambda _: next(typed))

    ran = run("-C", folder, "sweep")

    assert ran.code == 0
    assert ran.out.count("[ OK ] PASS") == 2
    assert "is no serial" in ran.err


def test_instrument_trouble_is_exit_code_5(
    run: Run, folder: Path, server: PracticeServer, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Another instrument answers than the bench file names."""
    del server, monkeypatch
    text = (folder / "bench.toml").read_text()
    (folder / "bench.toml").write_text(
        text.replace('driver = "source_generic"', 'driver = "source_generic"\nidentity = "no such"')
    )

    ran = run("-C", folder, "sweep", "0001")

    assert ran.code == 5
    assert "another instrument answers" in ran.err


def test_figures_and_verdicts_again_are_new_rows(run: Run, folder: Path) -> None:
    """The old ones stay; a design with other limits gives another verdict."""
    run("-C", folder, "sweep", "0001")
    strict = folder / "strict.toml"
    strict.write_text((folder / "design.toml").read_text().replace("40 kHz", "70 kHz"))

    again = run("-C", folder, "extract", "0001", "--json")
    judged = run("-C", folder, "judge", "0001", "--design", strict, "--json")

    assert (again.code, again.data[0]["verdict"]["overall"]) == (0, "pass")
    assert (judged.code, judged.data[0]["verdict"]["overall"]) == (3, "fail")
    with Logbook(folder / "logbook.db", read_only=True) as logbook:
        info = logbook.info()
        assert (info.figures, info.verdicts, info.designs) == (2, 3, 2)


def test_history_finds_by_what_people_know(run: Run, folder: Path) -> None:
    """By serial, by verdict, by operator; a near miss is offered."""
    run("-C", folder, "sweep", "0001", "--operator", "ann")

    assert "0001" in run("-C", folder, "history").out
    assert run("-C", folder, "history", "--operator", "bob").out.startswith("nothing was measured")
    assert len(run("-C", folder, "history", "--verdict", "pass", "--json").data) == 1
    missing = run("-C", folder, "history", "001")
    assert missing.code == 1
    assert "did you mean 0001?" in missing.err


def test_logbook_tells_what_it_holds(run: Run, folder: Path) -> None:
    """Counts, journal mode, unfinished sweeps."""
    run("-C", folder, "sweep", "0001")

    known = run("-C", folder, "logbook", "info", "--json").data
    assert (known["boards"], known["sweeps"], known["points"]) == (1, 1, 16)
    assert known["unfinished"] == []
    assert "journal mode" in run("-C", folder, "logbook", "info").out


def test_bench_check_says_ready_and_cautions(run: Run, folder: Path) -> None:
    """Every instrument answers; the usual cautions are there."""
    ran = run("-C", folder, "bench", "check")

    assert ran.code == 0
    for words in ("benchlog practice,sine source", "Capacitors stay charged", "safety rules"):
        assert words in ran.out
    assert run("-C", folder, "bench", "check", "--json").data["ready"] is True


def test_bench_check_names_what_is_missing(run: Run, folder: Path, server: PracticeServer) -> None:
    """A dead instrument is told with its address, and the code is 5."""
    text = (folder / "bench.toml").read_text()
    dead = server.addresses.source
    (folder / "bench.toml").write_text(text.replace(dead, "TCPIP::127.0.0.1::9::SOCKET"))

    ran = run("-C", folder, "bench", "check")

    assert ran.code == 5
    assert "TROUBLE" in ran.out
    assert "NOT READY" in ran.out


def test_bench_in_use_is_not_shared(run: Run, folder: Path) -> None:
    """A second sweep would change the source under the first one's readings."""
    from benchlog.bench.setup import open_bench, read_bench

    with open_bench(read_bench(folder / "bench.toml")):
        ran = run("-C", folder, "sweep", "0002")

    assert ran.code == 5
    assert "the instrument is in use by process" in ran.err
    assert run("-C", folder, "sweep", "0002").code == 0


def test_serial_without_a_complete_sweep_is_told_as_such(run: Run, folder: Path) -> None:
    """Not as a serial that nobody knows."""
    from benchlog.cli.street import new_uuid, now
    from benchlog.records import SweepStart

    start = SweepStart(
        uuid=new_uuid(), serial="0009", kind="sweep", started_at=now(), design_sha256=None
    )
    with Logbook(folder / "logbook.db") as logbook:
        logbook.begin_sweep(start)
        logbook.end_sweep(start.uuid, "stopped", "for this test")

    ran = run("-C", folder, "extract", "0009")

    assert ran.code == 1
    assert "serial 0009 has no complete sweep: the last one is stopped" in ran.err
