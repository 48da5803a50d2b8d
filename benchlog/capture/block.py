"""Find the numbers in a text: delimiter and decimal mark, header, block, what stands around it.

Every pair of delimiter and decimal mark is tried on the whole text; the pair that makes the
longest run of rows that are all numbers wins.  Nothing is skipped by a fixed count.
"""

import csv
import math
import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from benchlog.capture.cells import Decimal, number
from benchlog.capture.text import Text
from benchlog.errors import CaptureError

_DELIMITERS = (",", ";", "\t", "|", " ")
_NAMES = {",": "comma", ";": "semicolon", "\t": "tab", "|": "bar", " ": "blanks"}
_HINT = re.compile(r'"?sep=(.)"?', re.IGNORECASE)
_FEWEST_ROWS = 3
_MOST_HEADER_ROWS = 2
_COMMENT = "#;%!"


@dataclass(frozen=True, slots=True, kw_only=True)
class Block:
    """A table of numbers found in a text.

    Attributes:
        rows: Numbers, NaN for states; all rows have the same length.
        first_line: Line of the first row, counted from 1.
        header: Rows of words above the block, nearest last, padded to its width.
        preamble: Lines above the header.
        footer: Lines below the block that are not blank.
        delimiter, decimal: What separates cells, and the decimal mark.
        notes: What was passed over, for people.
    """

    rows: tuple[tuple[float, ...], ...]
    first_line: int
    header: tuple[tuple[str, ...], ...]
    preamble: tuple[str, ...]
    footer: tuple[str, ...]
    delimiter: str
    decimal: Decimal
    notes: tuple[str, ...]

    @property
    def delimiter_name(self) -> str:
        """What people call the delimiter."""
        return _NAMES[self.delimiter]


@dataclass(frozen=True, slots=True)
class _Run:
    """Consecutive lines that are rows of numbers of one width."""

    first: int
    rows: list[tuple[float, ...]]


def find_block(text: Text) -> Block:
    """Find the longest table of numbers.

    Raises:
        CaptureError: There is none, or two readings of the text are equally good and differ.
    """
    told = _told_delimiter(text.lines)
    found: list[tuple[_Run, str, Decimal]] = []
    for delimiter in (told,) if told else _DELIMITERS:
        for decimal in _decimals(delimiter):
            run = _longest_run(text.lines, delimiter, decimal)
            if run is not None:
                found.append((run, delimiter, decimal))
    if not found:
        found = _beside_preamble(text.lines)
    if not found:
        raise CaptureError(
            "no table of numbers was found",
            expected=f"at least {_FEWEST_ROWS} rows with two or more numbers each",
            hint="open the file in an editor: is it the one you meant?",
        )
    best = max(found, key=_score)
    _refuse_ambiguous(best, found)
    return _block(text, best)


def _beside_preamble(lines: Sequence[str]) -> list[tuple[_Run, str, Decimal]]:
    """Find numbers that stand beside the preamble: in the last columns of every line."""
    found: list[tuple[_Run, str, Decimal]] = []
    for delimiter in (",", ";", "\t"):
        for decimal in _decimals(delimiter):
            cut = [delimiter.join(_numbers_at_end(line, delimiter, decimal)) for line in lines]
            run = _longest_run(cut, delimiter, decimal)
            if run is not None:
                found.append((run, delimiter, decimal))
    return found


def _numbers_at_end(line: str, delimiter: str, decimal: Decimal) -> list[str]:
    """Return the cells at the end of a line that are numbers, behind a blank or a word."""
    cells = _cells(line, delimiter)
    place = len(cells)
    while place > 0 and number(cells[place - 1], decimal) is not None:
        place -= 1
    return cells[place:] if place > 0 else []


def _score(candidate: tuple[_Run, str, Decimal]) -> tuple[int, int]:
    run, _, _ = candidate
    return len(run.rows), len(run.rows[0])


def _refuse_ambiguous(
    best: tuple[_Run, str, Decimal], found: Sequence[tuple[_Run, str, Decimal]]
) -> None:
    for other in found:
        if _score(other) == _score(best) and not _same(other[0].rows, best[0].rows):
            raise CaptureError(
                f"the numbers can be read in two ways: {_NAMES[best[1]]} with decimal"
                f" {best[2]!r}, or {_NAMES[other[1]]} with decimal {other[2]!r}",
                expected="one way to read them",
                hint="put a line sep=; (or sep=,) at the top of the file",
            )


def _same(one: list[tuple[float, ...]], other: list[tuple[float, ...]]) -> bool:
    return all(
        a == b or (math.isnan(a) and math.isnan(b))
        for left, right in zip(one, other, strict=True)
        for a, b in zip(left, right, strict=True)
    )


def _told_delimiter(lines: Sequence[str]) -> str | None:
    """Return what a ``sep=`` line says; office programs write one at the top."""
    found = _HINT.fullmatch(lines[0].strip("\ufeff \t")) if lines else None
    return found[1] if found and found[1] in _DELIMITERS else None


def _decimals(delimiter: str) -> tuple[Decimal, ...]:
    return (".",) if delimiter == "," else (".", ",")


def _longest_run(lines: Sequence[str], delimiter: str, decimal: Decimal) -> _Run | None:
    best: _Run | None = None
    for run in _runs(lines, delimiter, decimal):
        if best is None or len(run.rows) > len(best.rows):
            best = run
    return best if best is not None and len(best.rows) >= _FEWEST_ROWS else None


def _runs(lines: Sequence[str], delimiter: str, decimal: Decimal) -> Iterator[_Run]:
    run: _Run | None = None
    for place, line in enumerate(lines):
        row = _row(line, delimiter, decimal)
        if row is not None and run is not None and len(row) == len(run.rows[0]):
            run.rows.append(row)
            continue
        if run is not None:
            yield run
        run = None if row is None else _Run(place, [row])
    if run is not None:
        yield run


def _row(line: str, delimiter: str, decimal: Decimal) -> tuple[float, ...] | None:
    """Return a line's numbers, or None where it is no row of at least two numbers."""
    cells = _cells(line, delimiter)
    if len(cells) < 2:
        return None
    values = [number(cell, decimal) for cell in cells]
    if any(value is None for value in values):
        return None
    known = [value for value in values if value is not None]
    return tuple(known) if any(math.isfinite(value) for value in known) else None


def _cells(line: str, delimiter: str) -> list[str]:
    """Split a line; empty cells at its end come from a trailing delimiter and are dropped."""
    if delimiter == " ":
        return line.split()
    try:
        cells = next(csv.reader([line], delimiter=delimiter), [])
    except csv.Error:
        return []
    while cells and not cells[-1].strip():
        cells.pop()
    return cells


def _block(text: Text, found: tuple[_Run, str, Decimal]) -> Block:
    run, delimiter, decimal = found
    first, after = run.first, run.first + len(run.rows)
    header = _header(text.lines[:first], delimiter, len(run.rows[0]))
    above = text.lines[: first - len(header)]
    footer = [line for line in text.lines[after:] if line.strip()]
    notes = []
    if footer and _is_cut_row(footer[0], delimiter, decimal):
        notes.append(f"line {after + 1} is cut off and was left out: {footer[0]!r}")
        footer = footer[1:]
    if footer:
        notes.append(f"{len(footer)} lines below the table were passed over")
    return Block(
        rows=tuple(run.rows),
        first_line=first + 1,
        header=header,
        preamble=tuple(line for line in above if line.strip() and not _HINT.fullmatch(line)),
        footer=tuple(footer),
        delimiter=delimiter,
        decimal=decimal,
        notes=tuple(notes),
    )


def _header(above: Sequence[str], delimiter: str, width: int) -> tuple[tuple[str, ...], ...]:
    """Return the rows of words directly above the block, top first."""
    rows: list[tuple[str, ...]] = []
    for line in reversed(above):
        if not line.strip() and not rows:
            # A blank line may stand between names and numbers.
            continue
        cells = [
            cell.strip()
            for cell in _cells(line.lstrip(_COMMENT.replace(delimiter, "") + " "), delimiter)
        ]
        if len(cells) != width or len(rows) == _MOST_HEADER_ROWS:
            break
        if any(number(cell, ".") is not None for cell in cells):
            # A line of the preamble that happens to have as many cells.
            break
        rows.insert(0, tuple(cells))
    return tuple(rows)


def _is_cut_row(line: str, delimiter: str, decimal: Decimal) -> bool:
    """Tell a last line that a stick was pulled on: it begins with a number and then breaks off."""
    cells = _cells(line, delimiter)
    return bool(cells) and number(cells[0], decimal) is not None
