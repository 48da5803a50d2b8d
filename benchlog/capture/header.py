"""The rows of words above a table: names, or names and units."""

import re
from collections.abc import Sequence
from dataclasses import dataclass

from benchlog.capture.cells import number
from benchlog.capture.channels import is_time, is_time_or_volts
from benchlog.capture.columns import is_unit, kind_of, split_name
from benchlog.capture.rows import Dialect, Run, split, trimmed

_MOST_ROWS = 2
_COMMENT = "#;%!"
_RULE = re.compile(r"[\s|+:=_-]*[=_-]{2,}[\s|+:=_-]*")
_APART = re.compile(r"\s{2,}|\t")
_WITH_UNIT = re.compile(r"\S+(?:\s+[\(\[][^\)\]]*[\)\]]|\s+/\s+\S+)?")


@dataclass(frozen=True, slots=True, kw_only=True)
class Header:
    """Rows of words, top first, each as wide as the table; and the place of the topmost line."""

    rows: tuple[tuple[str, ...], ...]
    first: int


def find_header(lines: Sequence[str], dialect: Dialect, run: Run) -> Header:
    """Return the words above a run; blank lines, rules and comments may stand between."""
    rows: list[tuple[str, ...]] = []
    first, apart = run.lines[0], False
    for place in range(run.lines[0] - 1, -1, -1):
        cells = _words(lines[place], dialect.delimiter, run)
        if cells is not None:
            rows.insert(0, cells)
            first = place
            if len(rows) == _MOST_ROWS:
                break
        elif _is_between(lines[place]):
            apart = apart or not rows
        else:
            break
    if apart and not any(map(names_a_cause, rows)):
        # Two words of a preamble, with a blank line below them, are no header.
        return Header(rows=(), first=run.lines[0])
    if len(rows) == _MOST_ROWS and not _are_names_and_units(*rows):
        return Header(rows=(rows[1],), first=_next_text(lines, first))
    return Header(rows=tuple(rows), first=first)


def _next_text(lines: Sequence[str], place: int) -> int:
    return next(at for at in range(place + 1, len(lines)) if not _is_between(lines[at]))


def _words(line: str, delimiter: str, run: Run) -> tuple[str, ...] | None:
    """Return a line's cells above the numbers; None where they do not fit or are no words."""
    if _RULE.fullmatch(line) or not line.strip():
        return None
    plain = line.lstrip(_COMMENT + " ") if delimiter != ";" else line.lstrip("#%! ")
    after = run.columns[-1] + 1
    for cells in _cuttings(plain, delimiter):
        kept = cells if run.beside else trimmed(cells)
        if len(kept) > after and not run.beside:
            continue
        if len(cells) < after:
            continue
        padded = [*kept, *[""] * (after - len(kept))]
        picked = tuple(padded[place].strip() for place in run.columns)
        if any(picked) and not any(number(cell, ".") is not None for cell in picked):
            return picked
    return None


def _cuttings(line: str, delimiter: str) -> list[list[str]]:
    """Return the ways to cut a line: names with blanks in them stand in tables set with blanks."""
    if delimiter != " ":
        return [split(line, delimiter)]
    line = line.strip()
    return [_APART.split(line), line.split(), _WITH_UNIT.findall(line)]


def _is_between(line: str) -> bool:
    return (
        not line.strip(" \t,;|")
        or _RULE.fullmatch(line) is not None
        or line.lstrip().startswith(tuple(_COMMENT))
    )


def names_a_cause(cells: Sequence[str]) -> bool:
    """Tell whether one of the names is that of frequency or time, which every table has."""
    names = [split_name(cell)[0] for cell in cells]
    return any(kind_of(name) in {"frequency", "input", "output"} or is_time(name) for name in names)


def _are_names_and_units(names: Sequence[str], units: Sequence[str]) -> bool:
    bare = [cell.strip("()[] ") for cell in units]
    if any(is_unit(cell) or is_time_or_volts(cell) for cell in bare):
        return True
    return names_a_cause(names) and not names_a_cause(units)
