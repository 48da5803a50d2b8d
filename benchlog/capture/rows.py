"""Rows of numbers among the lines of a text, for one delimiter and decimal mark."""

import csv
import math
from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from benchlog.capture.cells import Decimal, number

FEWEST_ROWS = 3


@dataclass(frozen=True, slots=True, kw_only=True)
class Dialect:
    """What separates cells, and the decimal mark."""

    delimiter: str
    decimal: Decimal


@dataclass(frozen=True, slots=True, kw_only=True)
class Run:
    """Rows of numbers with nothing but blank lines between them.

    Attributes:
        lines: Place of each row among the lines, from 0.
        rows: Numbers, NaN for states and empty cells; all rows have the same length.
        columns: Which cells of a line the numbers are.
        beside: Whether lines hold words beside the numbers.
    """

    lines: tuple[int, ...]
    rows: tuple[tuple[float, ...], ...]
    columns: tuple[int, ...]
    beside: bool


@dataclass(frozen=True, slots=True)
class _Line:
    place: int
    width: int
    values: tuple[float | None, ...]


def split(line: str, delimiter: str) -> list[str]:
    """Return the cells of a line, empty ones at its end too."""
    if delimiter == " ":
        return line.split()
    if delimiter == "|":
        # Tables made for eyes have bars at both ends.
        line = line.strip().removeprefix("|").removesuffix("|")
    try:
        return next(csv.reader([line], delimiter=delimiter), [])
    except csv.Error:
        return []


def trimmed(cells: Sequence[str]) -> list[str]:
    """Drop empty cells at the end: they come from trailing delimiters."""
    kept = list(cells)
    while kept and not kept[-1].strip():
        kept.pop()
    return kept


def longest_run(lines: Sequence[str], dialect: Dialect) -> Run | None:
    """Return the longest run of lines that hold nothing but numbers."""
    read = [_line(place, line, dialect) for place, line in enumerate(lines)]
    widths = Counter(len(line.values) for line in read if _is_row(line.values))
    if not widths:
        return None
    # The commonest width; the wider one where two are equally common.
    width = max(widths, key=lambda one: (widths[one], one))
    return _longest(_runs(read, tuple(range(width)), beside=False))


def longest_run_beside(lines: Sequence[str], dialect: Dialect) -> Run | None:
    """Return the longest run of rows that have words in other columns than the numbers.

    Columns that hold numbers on most lines are the table; what stands in the others is preamble
    or remark.
    """
    read = [_line(place, line, dialect) for place, line in enumerate(lines)]
    columns = _columns(read)
    return _longest(_runs(read, columns, beside=True)) if len(columns) >= 2 else None


def row_of(line: str, dialect: Dialect, run: Run) -> tuple[float, ...] | None:
    """Read a line as one more row of a run; None where it is none."""
    return _picked(_line(0, line, dialect), run.columns, beside=run.beside)


def _line(place: int, text: str, dialect: Dialect) -> _Line:
    cells = split(text, dialect.delimiter)
    values = tuple(_value(cell, dialect.decimal) for cell in trimmed(cells))
    return _Line(place, len(cells), values)


def _value(cell: str, decimal: Decimal) -> float | None:
    return math.nan if not cell.strip() else number(cell, decimal)


def _is_row(values: Sequence[float | None]) -> bool:
    return len(values) >= 2 and None not in values and any(map(_is_number, values))


def _columns(lines: Sequence[_Line]) -> tuple[int, ...]:
    counts = Counter(
        place for line in lines for place, value in enumerate(line.values) if _is_number(value)
    )
    most = max(counts.values(), default=0)
    return tuple(sorted(place for place, count in counts.items() if 2 * count > most))


def _picked(line: _Line, columns: tuple[int, ...], *, beside: bool) -> tuple[float, ...] | None:
    """Return a line's numbers in some columns; cells that are missing at its end are NaN."""
    after = columns[-1] + 1
    if line.width < after or (len(line.values) > after and not beside):
        return None
    padded = (*line.values, *[math.nan] * (after - len(line.values)))
    values = [padded[place] for place in columns]
    if not any(map(_is_number, values)):
        return None
    others = [value for place, value in enumerate(padded) if place not in columns]
    if None not in others and any(map(_is_number, others)):
        # A number too many and no word that it belongs to: perhaps a decimal comma.
        return None
    known = tuple(value for value in values if value is not None)
    return known if len(known) == len(values) else None


def _is_number(value: float | None) -> bool:
    return value is not None and math.isfinite(value)


def _runs(lines: Sequence[_Line], columns: tuple[int, ...], *, beside: bool) -> Iterator[Run]:
    places: list[int] = []
    rows: list[tuple[float, ...]] = []
    for line in lines:
        if not line.values:
            continue
        row = _picked(line, columns, beside=beside)
        if row is not None:
            places.append(line.place)
            rows.append(row)
        elif rows:
            yield Run(lines=tuple(places), rows=tuple(rows), columns=columns, beside=beside)
            places, rows = [], []
    if rows:
        yield Run(lines=tuple(places), rows=tuple(rows), columns=columns, beside=beside)


def _longest(runs: Iterator[Run]) -> Run | None:
    best = max(runs, key=lambda run: len(run.rows), default=None)
    return best if best is not None and len(best.rows) >= FEWEST_ROWS else None
