"""Running commands as a user does, without a new process."""

import json
import sys
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest

from benchlog.cli import main
from benchlog.cli.new import bench_text, make_folder
from benchlog.design.example import EXAMPLE_DESIGN
from benchlog.design.read import parse_design
from benchlog.practice.board import PracticeBoard
from benchlog.practice.server import PracticeServer
from benchlog.practice.world import World


@dataclass(frozen=True, slots=True, kw_only=True)
class Ran:
    """What a command printed, and its exit code."""

    code: int
    out: str
    err: str

    @property
    def data(self) -> Any:  # noqa: ANN401 - whatever JSON holds
        """What stdout holds as JSON, which must be strict."""

        def refuse(word: str) -> None:
            raise AssertionError(f"{word} is no JSON")

        return json.loads(self.out, parse_constant=refuse)


Run = Callable[..., Ran]


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> Run:
    """Return a function that runs ``benchlog`` with arguments."""

    def run(*arguments: object) -> Ran:
        monkeypatch.setattr(sys, "argv", ["benchlog", *map(str, arguments)])
        capsys.readouterr()
        with pytest.raises(SystemExit) as ended:
            main()
        out, err = capsys.readouterr()
        assert "Traceback" not in err
        code = ended.value.code
        assert isinstance(code, int)
        return Ran(code=code, out=out, err=err)

    return run


@pytest.fixture
def server() -> Iterator[PracticeServer]:
    """Yield a practice bench on free ports with a nominal board on it."""
    design = parse_design(EXAMPLE_DESIGN, where="example")
    with PracticeServer(World(PracticeBoard(design, spread=False), seed=1)) as running:
        yield running


@pytest.fixture
def folder(tmp_path: Path, server: PracticeServer) -> Path:
    """Return a bench folder for the practice bench, with a schedule short enough for tests."""
    source, output, before = (int(address.split("::")[2]) for address in server.addresses)
    made = tmp_path / "bench"
    make_folder(made, bench_text((source, output, before)))
    short = '\n[sweep]\nstart = "1 kHz"\nstop = "1 MHz"\nper_decade = 5\n'
    (made / "design.toml").write_text(EXAMPLE_DESIGN + short)
    return made
