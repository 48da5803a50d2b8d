"""Why a text is no table, or a broken one: what was seen, where, and what to do about it."""

import re
from collections.abc import Sequence

from benchlog.capture.cells import number
from benchlog.capture.rows import FEWEST_ROWS, Dialect, Run, split
from benchlog.errors import CaptureError

_FIRST_LINES = 500
_THOUSANDS = re.compile(
    r"(?<![\d.,])(\d{1,3}(?:[ '\u00a0\u2019\u202f]\d{3})+(?:[.,]\d*)?"
    r"|\d{1,3}(?:\.\d{3})+,\d+|\d{1,3}(?:,\d{3})+\.\d+)(?![\d.,])"
)
_QUOTED_THOUSANDS = re.compile(r"\"(\d{1,3}(?:,\d{3})+)\"")
_ONLY_THOUSANDS = re.compile(r"[1-9]\d{0,2}(,\d{3})+")
_WITH_UNIT = re.compile(
    r"(?<![\w.])([+-]?\d+(?:[.,]\d+)?(?:[eE][+-]?\d+)? ?"
    r"[pnuµmkMG]?(?:Hz|dB[Vum]?|V(?:pp|rms|pk)?))(?!\w)"
)


def no_table(lines: Sequence[str], *, told: str | None) -> CaptureError:
    """Return the error for a text in which no table was found.

    Args:
        lines: The text.
        told: The delimiter that its first line names; None where it names none.
    """
    if told is not None:
        return CaptureError(
            f"no table of numbers was found between the delimiters that line 1 names: {told!r}",
            where="line 1",
            expected=f"at least {FEWEST_ROWS} rows with two or more numbers each",
            hint="correct the line sep=, or remove it",
        )
    for place, line in enumerate(lines[:_FIRST_LINES], start=1):
        thousands = _THOUSANDS.search(line) or _QUOTED_THOUSANDS.search(line)
        if thousands is not None:
            return _thousands(thousands[1], place)
    for place, line in enumerate(lines[:_FIRST_LINES], start=1):
        united = _WITH_UNIT.findall(line)
        if len(united) >= 2:
            return CaptureError(
                f"the cells carry units: {united[0]!r}",
                where=f"line {place}",
                expected="numbers alone, with the unit in the header: Frequency (Hz)",
                hint="export numbers without units, or remove the units in an editor",
            )
    return CaptureError(
        "no table of numbers was found",
        expected=f"at least {FEWEST_ROWS} rows with two or more numbers each",
        hint="open the file in an editor: is it the one you meant?",
    )


def refuse_thousands(lines: Sequence[str], run: Run, dialect: Dialect) -> None:
    """Refuse quoted cells between commas that may be thousands or decimals.

    Raises:
        CaptureError: All commas inside cells stand where a thousands mark would.
    """
    if dialect.delimiter != "," or dialect.decimal != ",":
        return
    cells = [
        (place, cell.strip())
        for place in run.lines
        for cell in split(lines[place], dialect.delimiter)
        if "," in cell
    ]
    if cells and all(_ONLY_THOUSANDS.fullmatch(cell) for _, cell in cells):
        raise _thousands(cells[0][1], cells[0][0] + 1)


def broken_table(line: str, place: int, dialect: Dialect, *, width: int) -> CaptureError:
    """Return the error for a line that stands between rows and is none.

    Args:
        line: The line.
        place: From 0.
        dialect: Of the rows.
        width: Cells of a row.
    """
    cells = split(line, dialect.delimiter)
    wrong = [at for at, cell in enumerate(cells) if number(cell, dialect.decimal) is None]
    at_cell = len(cells) == width and len(wrong) == 1
    shown = cells[wrong[0]] if at_cell else line[:60]
    return CaptureError(
        f"the table is broken by {shown!r}",
        where=f"line {place + 1}, column {wrong[0] + 1}" if at_cell else f"line {place + 1}",
        expected=f"rows of {width} numbers, one below the other",
        hint="correct or remove the line; of two tables in a file keep one",
    )


def _thousands(text: str, line: int) -> CaptureError:
    return CaptureError(
        f"{text!r} may hold a thousands mark, which is never guessed",
        where=f"line {line}",
        expected="numbers with nothing but a decimal mark",
        hint="export without thousands marks",
    )
