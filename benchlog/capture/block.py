"""Find the numbers in a text: delimiter and decimal mark, header, block, what stands around it.

Every pair of delimiter and decimal mark is tried on the whole text; the pair that makes the
longest run of rows that are all numbers wins.  Nothing is skipped by a fixed count, and no row
of numbers is left out without a word.
"""

import math
import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from benchlog.capture.cells import Decimal, number
from benchlog.capture.header import Header, find_header, names_a_cause
from benchlog.capture.refusal import broken_table, no_table, refuse_thousands
from benchlog.capture.rows import (
    FEWEST_ROWS,
    Dialect,
    Run,
    longest_run,
    longest_run_beside,
    row_of,
    split,
    trimmed,
)
from benchlog.capture.text import Text
from benchlog.errors import CaptureError

_DELIMITERS = (",", ";", "\t", "|", " ")
_NAMES = {",": "comma", ";": "semicolon", "\t": "tab", "|": "bar", " ": "blanks"}
_HINT = re.compile(r'"?sep=(.)"?', re.IGNORECASE)
_CUT = re.compile(r"[+-]?[0-9]*[.,]?[0-9]*([eEdD][+-]?[0-9]*)?")


@dataclass(frozen=True, slots=True, kw_only=True)
class Block:
    """A table of numbers found in a text.

    Attributes:
        rows: Numbers, NaN for states and empty cells; all rows have the same length.
        lines: Line of each row, counted from 1.
        header: Rows of words above the block, top first, as wide as it.
        preamble: What stands above the header, and beside the numbers.
        footer: Lines below the block that are not blank.
        delimiter, decimal: What separates cells, and the decimal mark.
        beside: Whether words stand beside the numbers, so that its columns are not the file's.
        notes: What was passed over, for people.
    """

    rows: tuple[tuple[float, ...], ...]
    lines: tuple[int, ...]
    header: tuple[tuple[str, ...], ...]
    preamble: tuple[str, ...]
    footer: tuple[str, ...]
    delimiter: str
    decimal: Decimal
    beside: bool
    notes: tuple[str, ...]

    @property
    def first_line(self) -> int:
        """Line of the first row, counted from 1."""
        return self.lines[0]

    @property
    def delimiter_name(self) -> str:
        """What people call the delimiter."""
        return _NAMES[self.delimiter]


@dataclass(frozen=True, slots=True)
class _Found:
    run: Run
    dialect: Dialect
    header: Header


def find_block(text: Text) -> Block:
    """Find the longest table of numbers.

    Raises:
        CaptureError: There is none, it is broken in the middle, or two readings of the text are
            equally good and differ.
    """
    lines = text.lines
    dialects = _dialects(lines)
    found = _best([_found(lines, one, longest_run) for one in dialects])
    if found is None or not found.header.rows:
        looks = [_found(lines, one, longest_run_beside) for one in dialects]
        beside = _best([one for one in looks if one is not None and _is_table(lines, one)])
        if beside is not None and (found is None or len(beside.run.rows) >= len(found.run.rows)):
            found = beside
    if found is None:
        raise no_table(lines, told=_told_delimiter(lines))
    return _block(lines, found)


def _found(
    lines: Sequence[str], dialect: Dialect, look: Callable[[Sequence[str], Dialect], Run | None]
) -> _Found | None:
    run = look(lines, dialect)
    return None if run is None else _Found(run, dialect, find_header(lines, dialect, run))


def _is_table(lines: Sequence[str], found: _Found) -> bool:
    """Tell a table with words beside it from numbers that happen to stand among words."""
    return bool(found.header.rows) or 2 * len(_beside(lines, found)) < len(found.run.rows)


def _dialects(lines: Sequence[str]) -> list[Dialect]:
    """Return what is worth trying: delimiters that occur, decimal commas where they can be."""
    told = _told_delimiter(lines)
    occur = [one for one in _DELIMITERS if any(one in line for line in lines)]
    dialects: list[Dialect] = []
    for delimiter in (told,) if told else occur:
        dialects.append(Dialect(delimiter=delimiter, decimal="."))
        # Between commas, a number with a decimal comma stands in quotes.
        if delimiter != "," or any('"' in line for line in lines):
            dialects.append(Dialect(delimiter=delimiter, decimal=","))
    return dialects


def _told_delimiter(lines: Sequence[str]) -> str | None:
    """Return what a ``sep=`` line says; office programs write one at the top."""
    found = _HINT.fullmatch(lines[0].strip("\ufeff \t")) if lines else None
    return found[1] if found and found[1] in _DELIMITERS else None


def _best(looks: Sequence[_Found | None]) -> _Found | None:
    """Return the reading with the longest run, and the wider one of two equally long ones.

    Raises:
        CaptureError: Two readings are equally good and differ.
    """
    found = [one for one in looks if one is not None]
    if not found:
        return None
    best = max(found, key=lambda one: _score(one.run))
    for other in found:
        if _score(other.run) == _score(best.run) and not _same(other.run.rows, best.run.rows):
            one, two = (
                f"{_NAMES[dialect.delimiter]} with decimal {dialect.decimal!r}"
                for dialect in (best.dialect, other.dialect)
            )
            raise CaptureError(
                f"the numbers can be read in two ways: {one}, or {two}",
                where=f"line {best.run.lines[0] + 1}",
                expected="one way to read them",
                hint="put a line sep=; (or sep=,) at the top of the file",
            )
    return best


def _score(run: Run) -> tuple[int, int]:
    return len(run.rows), len(run.columns)


def _same(one: Sequence[Sequence[float]], other: Sequence[Sequence[float]]) -> bool:
    return all(
        a == b or (math.isnan(a) and math.isnan(b))
        for left, right in zip(one, other, strict=True)
        for a, b in zip(left, right, strict=True)
    )


def _block(lines: Sequence[str], found: _Found) -> Block:
    run, dialect = found.run, found.dialect
    refuse_thousands(lines, run, dialect)
    places, rows, notes = _counted_off(run)
    if _is_cut_off(lines, places, found):
        places, rows = places[:-1], rows[:-1]
    if run.beside:
        notes.append("words beside the numbers were taken for preamble or remarks")
    after = places[-1] + 1
    _refuse_broken(lines, found, after)
    below = [(place, lines[place]) for place in range(after, len(lines)) if lines[place].strip()]
    cut = _cut_lines(below, found)
    notes += [f"line {place + 1} is cut off and was left out: {line!r}" for place, line in cut]
    footer = [line for _, line in below[len(cut) :]]
    if footer:
        lines_are = "1 line" if len(footer) == 1 else f"{len(footer)} lines"
        notes.append(f"{lines_are} below the table passed over, from: {footer[0][:60]!r}")
    above = [line for line in lines[: found.header.first] if line.strip()]
    if above and _HINT.fullmatch(above[0].strip("\ufeff \t")):
        above = above[1:]
    return Block(
        rows=tuple(rows),
        lines=tuple(place + 1 for place in places),
        header=found.header.rows,
        preamble=(*above, *(_beside(lines, found) if run.beside else ())),
        footer=tuple(footer),
        delimiter=dialect.delimiter,
        decimal=dialect.decimal,
        beside=run.beside,
        notes=tuple(notes),
    )


def _counted_off(run: Run) -> tuple[list[int], list[tuple[float, ...]], list[str]]:
    """Leave out a first row that only counts the rows below it."""
    places, rows = list(run.lines), list(run.rows)
    counted = len(rows) - 1
    if counted >= FEWEST_ROWS and all(value == counted for value in rows[0]):
        note = f"line {places[0] + 1} counts the rows and was left out"
        return places[1:], rows[1:], [note]
    return places, rows, []


def _is_cut_off(lines: Sequence[str], places: Sequence[int], found: _Found) -> bool:
    """Tell whether the last row misses cells which the row before it has."""
    if found.run.beside:
        return False
    before, last = (
        len(trimmed(split(lines[place], found.dialect.delimiter))) for place in places[-2:]
    )
    return last < before == len(found.run.columns)


def _cut_lines(below: Sequence[tuple[int, str]], found: _Found) -> list[tuple[int, str]]:
    """Return the last line where a stick was pulled: it begins as a row and then breaks off.

    Raises:
        CaptureError: More than one line is like that.
    """
    cut = []
    for place, line in below:
        cells = trimmed(split(line, found.dialect.delimiter))
        begins = bool(cells) and number(cells[0], found.dialect.decimal) is not None
        partial = len(cells) == 1 and (place, line) == below[-1] and _CUT.fullmatch(line.strip())
        if not begins and not partial:
            break
        cut.append((place, line))
    if len(cut) > 1:
        first, last = cut[0][0] + 1, cut[-1][0] + 1
        raise CaptureError(
            f"{len(cut)} lines below the table begin like rows and are none",
            where=f"line {first} to line {last}",
            expected="at most one line that is cut off, at the end of the file",
        )
    return cut


def _refuse_broken(lines: Sequence[str], found: _Found, after: int) -> None:
    """Refuse a table that goes on behind words, or that words without a header cut in two."""
    run, dialect = found.run, found.dialect

    def is_row(place: int) -> bool:
        return row_of(lines[place], dialect, run) is not None

    if any(is_row(place) for place in range(after, len(lines))):
        # A row that was taken for cut off breaks nothing by itself.
        broken = (place for place in range(after, len(lines)) if not is_row(place))
        at = next((place for place in broken if lines[place].strip()), None)
        if at is not None and any(is_row(place) for place in range(at, len(lines))):
            raise broken_table(lines[at], at, dialect, width=len(run.columns))
    if not found.header.rows:
        _refuse_misfit(lines, found)
    above = [place for place in range(run.lines[0]) if is_row(place)]
    if len(above) >= FEWEST_ROWS or (above and not found.header.rows):
        behind = range(above[-1] + 1, run.lines[0])
        at = next(place for place in behind if lines[place].strip())
        raise broken_table(lines[at], at, dialect, width=len(run.columns))


def _refuse_misfit(lines: Sequence[str], found: _Found) -> None:
    """Refuse names right above the numbers that are more or fewer than the columns."""
    run = found.run
    at = next((place for place in range(run.lines[0] - 1, -1, -1) if lines[place].strip()), None)
    cells = [] if at is None else trimmed(split(lines[at], found.dialect.delimiter))
    if at is not None and len(cells) != len(run.columns) and names_a_cause(cells):
        raise CaptureError(
            f"the line above the numbers has {len(cells)} cells, and they have"
            f" {len(run.columns)} columns",
            where=f"line {at + 1}",
            expected="a name for each column",
            hint="are there decimal commas between commas? Export with semicolons",
        )


def _beside(lines: Sequence[str], found: _Found) -> tuple[str, ...]:
    """Return the words beside the numbers, line by line, with the delimiter between them."""
    delimiter = found.dialect.delimiter
    words = []
    for line in lines[found.header.first : found.run.lines[-1] + 1]:
        cells = split(line, delimiter)
        kept = [cell for place, cell in enumerate(cells) if place not in found.run.columns]
        words.append(delimiter.join(trimmed(kept)))
    return tuple(word for word in words if word.strip())
