"""The rules of the house: which room may import which, how large things are, what is light."""

import ast
import json
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
PACKAGE = ROOT / "benchlog"
MODULES = sorted(PACKAGE.rglob("*.py"))

# The steps of the street: a room may import rooms of earlier steps, and itself.
STEPS: tuple[tuple[str, ...], ...] = (
    ("errors", "folders"),
    ("notation",),
    ("quantity",),
    ("table_types", "tables"),
    ("records",),
    ("curve",),
    ("circuit",),
    ("design",),
    ("extract", "judge", "sweep", "capture", "predict", "lots"),
    ("logbook", "bench", "practice", "report"),
    ("cli", "__init__", "__main__"),
)
# Rooms of one step that may know each other all the same.
NEIGHBOURS = {
    ("table_types", "tables"),
    ("tables", "table_types"),
    ("bench", "sweep"),
    ("bench", "logbook"),
    ("report", "logbook"),
    ("sweep", "extract"),
    ("predict", "extract"),
    ("predict", "judge"),
    ("cli", "__init__"),
    ("__main__", "cli"),
}
ONLY_IN = {
    "pyvisa": {"bench/link.py"},
    "sqlite3": {"logbook"},
    "sqlite_utils": {"logbook"},
    "matplotlib": {"report"},
    "click": {"cli"},
    "rich": {"cli", "report"},
}
LONGEST_FILE, LONGEST_FUNCTION = 400, 50


def room_of(module: Path) -> str:
    """Return the room a file belongs to: its folder, or its own name at the top."""
    inside = module.relative_to(PACKAGE)
    return inside.parts[0] if len(inside.parts) > 1 else inside.stem


def imports_of(module: Path) -> Iterator[str]:
    """Yield every imported module's dotted name, late imports too."""
    for node in ast.walk(ast.parse(module.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.module == "benchlog":
            yield from (f"benchlog.{alias.name}" for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.module is not None:
            yield node.module


def step_of(room: str) -> int:
    """Return the step of a room; a room that stands on none fails the test."""
    return next(place for place, rooms in enumerate(STEPS) if room in rooms)


@pytest.mark.parametrize("module", MODULES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_no_arrow_turns_back(module: Path) -> None:
    """A room imports from earlier steps only, or from a neighbour named above."""
    room = room_of(module)
    for name in imports_of(module):
        parts = name.split(".")
        if parts[0] != "benchlog" or parts[-1] == "__version__":
            continue
        other = parts[1] if len(parts) > 1 else "__init__"
        allowed = other == room or step_of(other) < step_of(room) or (room, other) in NEIGHBOURS
        assert allowed, f"{room} imports {other}"


@pytest.mark.parametrize("module", MODULES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_foreign_libraries_stay_in_their_rooms(module: Path) -> None:
    """Each library with side effects is known in one place."""
    inside = str(module.relative_to(PACKAGE)).replace("\\", "/")
    for name in imports_of(module):
        homes = ONLY_IN.get(name.split(".")[0])
        if homes is not None:
            assert inside in homes or room_of(module) in homes, f"{inside} imports {name}"


def test_practice_board_does_not_know_the_formulas_it_checks() -> None:
    """The practice bench solves node equations of its own."""
    for module in (PACKAGE / "practice").rglob("*.py"):
        assert not any(name.startswith("benchlog.circuit") for name in imports_of(module)), module


@pytest.mark.parametrize("module", MODULES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_files_and_functions_are_small(module: Path) -> None:
    """What does not fit on a few screens is two things."""
    text = module.read_text(encoding="utf-8")
    assert len(text.splitlines()) <= LONGEST_FILE
    for node in ast.walk(ast.parse(text)):
        if isinstance(node, ast.FunctionDef):
            length = (node.end_lineno or 0) - node.lineno + 1
            # A command's many options are its interface, not its body.
            allowed = LONGEST_FUNCTION + 15 * bool(module.parent.name == "cli")
            assert length <= allowed, f"{node.name} has {length} lines"


def test_top_level_holds_what_it_must_and_nothing_else() -> None:
    """Tracked names at the top level."""
    tracked = subprocess.run(
        ["git", "ls-files"], cwd=ROOT, capture_output=True, text=True, check=False
    )
    if tracked.returncode:
        pytest.skip("not a git checkout")
    names = {line.split("/")[0] for line in tracked.stdout.splitlines()}
    allowed = {
        "README.md",
        "DEVELOPERS.md",
        "pyproject.toml",
        "benchlog",
        "drivers",
        "tests",
        "sample_data",
        "schema",
    }
    assert {name for name in names if not name.startswith(".")} <= allowed


def imported_by(code: str) -> set[str]:
    """Return the top-level modules that a fresh interpreter holds after running some code."""
    program = f"import sys\n{code}\nimport json\nprint('\\n' + json.dumps(sorted(sys.modules)))"
    done = subprocess.run(
        [sys.executable, "-c", program], capture_output=True, text=True, check=True, cwd=ROOT
    )
    return {name.split(".")[0] for name in json.loads(done.stdout.splitlines()[-1])}


HEAVY = {"numpy", "scipy", "pandas", "pyvisa", "rich", "sqlite_utils", "msgspec", "quantiphy"}


def test_help_imports_nothing_heavy() -> None:
    """A command line that answers at once: click and nothing else."""
    code = (
        "from benchlog.cli import program\ntry: program.main(['--help'])\nexcept SystemExit: pass"
    )

    assert not imported_by(code) & (HEAVY | {"sqlite3"})


def test_importing_the_package_is_cheap() -> None:
    """Public names are fetched when they are asked for."""
    assert not imported_by("import benchlog") & (HEAVY | {"click", "sqlite3"})


def test_public_names_are_there() -> None:
    """Each name of ``__all__`` can be had, and nothing else pretends to be."""
    import benchlog

    for name in benchlog.__all__:
        assert getattr(benchlog, name) is not None
    with pytest.raises(AttributeError, match="no attribute 'sweep_everything'"):
        benchlog.sweep_everything  # noqa: B018 - asking is the test


def test_every_command_is_documented() -> None:
    """README and table name the same commands, each with the command's own short help."""
    import click

    from benchlog.cli import COMMANDS, program

    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    for name, (_, text) in COMMANDS.items():
        command = program.get_command(click.Context(program), name)
        assert command is not None
        assert command.short_help == text
        assert f"benchlog {name}" in readme or f"{name} SWEEP" in readme
