"""A file that was damaged on the disk never brings the program down."""

from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchlog.errors import BenchlogError, LogbookError
from benchlog.logbook.store import Logbook
from tests.fakes.sample_sweep import (
    DESIGN_SHA256,
    DESIGN_TEXT,
    sample_figures,
    sample_points,
    sample_start,
    sample_verdict,
)

_START = sample_start(design_sha256=DESIGN_SHA256)


@pytest.fixture(scope="module")
def whole(tmp_path_factory: pytest.TempPathFactory, empty_logbook_bytes: bytes) -> Path:
    """Return the path of a small logbook with something in every table."""
    path = tmp_path_factory.mktemp("damage") / "logbook.db"
    path.write_bytes(empty_logbook_bytes)
    with Logbook(path) as logbook:
        logbook.begin_sweep(
            _START, design_text=DESIGN_TEXT, design_name="line preamp", design_revision="C"
        )
        logbook.add_points(_START.uuid, sample_points(61))
        logbook.end_sweep(_START.uuid, "complete")
        figures_id = logbook.add_figures(_START.uuid, sample_figures())
        logbook.add_verdict(figures_id, sample_verdict(), "budget")
    return path


def test_bytes_that_are_no_text_in_the_schema_are_said_to_be_damage(whole: Path) -> None:
    """SQLite quotes the damaged bytes in its message, which Python then cannot read."""
    path = whole.with_name("spoilt.db")
    path.write_bytes(
        whole.read_bytes().replace(b"CREATE TABLE verdict", b"CREATE TABL\x80 verdict")
    )
    with pytest.raises(LogbookError, match="damaged: it holds bytes that are not text"):
        Logbook(path)


def _read_everything(path: Path) -> None:
    with Logbook(path, read_only=True) as logbook:
        logbook.info()
        logbook.boards()
        logbook.history()
        logbook.sweeps_of("0042")
        logbook.design(DESIGN_SHA256)
        logbook.curve(_START.uuid)
        logbook.latest_figures(_START.uuid)
        logbook.latest_verdict(_START.uuid)


@given(data=st.data())
@settings(max_examples=80, deadline=None)
def test_damaged_bytes_give_one_clear_error_or_none(whole: Path, data: st.DataObject) -> None:
    """Whatever bytes change, reading ends in an error for people, or in rows."""
    spoilt = bytearray(whole.read_bytes())
    for _ in range(data.draw(st.integers(1, 4))):
        place = data.draw(st.integers(0, len(spoilt) - 1))
        damage = data.draw(st.binary(min_size=1, max_size=40))
        spoilt[place : place + len(damage)] = damage
    path = whole.with_name("spoilt.db")
    path.write_bytes(spoilt)
    try:
        _read_everything(path)
    except BenchlogError as error:
        assert str(error)  # noqa: PT017 - no error is as good
