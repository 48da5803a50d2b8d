"""Tables for the terminal; every number rounded to its uncertainty."""

import io
import math
from collections.abc import Sequence

from rich import box
from rich.console import Console
from rich.table import Table

from benchlog.logbook.rows import HistoryRow
from benchlog.notation import plain, si, with_uncertainty
from benchlog.records import Figure, Figures, LineVerdict, Verdict

_SHOWN = {
    "gain": "gain",
    "gain_db": "gain",
    "lower_corner_hz": "lower corner",
    "corner_hz": "corner (-3 dB)",
    "bandwidth_hz": "bandwidth",
    "gbw_hz": "GBW",
    "peaking_db": "peaking",
    "peaking_hz": "peaking at",
    "unity_hz": "unity gain at",
}
_WIDTH = 100


def figure_text(figure: Figure | None) -> str:
    """Write a figure: ``"62.51(12) kHz"``, ``"at least 20 kHz"``, or ``"-"``."""
    if figure is None:
        return "-"
    if figure.bound is not None:
        return f"{figure.bound} {si(figure.value, figure.unit)}"
    return with_uncertainty(figure.value, figure.u, figure.unit)


def figures_table(figures: Figures) -> str:
    """Write all figures of a curve with u, U and what U is made of."""
    table = _table("figure", "value (u)", "U", "k", "largest cause")
    for name, words in _SHOWN.items():
        figure = figures.figure(name)
        if figure is None or (name == "bandwidth_hz" and figures.lower_corner_hz is None):
            continue
        expanded = "" if not figure.U else si(figure.U, figure.unit, 2)
        largest = max(figure.terms, key=lambda term: term.u).name if figure.terms else ""
        factor = f"{figure.k:.2f}" if figure.U else ""
        table.add_row(words, figure_text(figure), expanded, factor, largest)
    return _rendered(table)


def terms_table(figures: Figures) -> str:
    """Write the term tables side by side: the root sum of squares of each column is its u."""
    drawn = {
        name: figure
        for name in ("gain_db", "lower_corner_hz", "corner_hz", "gbw_hz")
        if (figure := figures.figure(name)) is not None and figure.u
    }
    causes = dict.fromkeys(term.name for figure in drawn.values() for term in figure.terms)
    table = _table("cause of uncertainty", *(f"u of {figure_words(name)}" for name in drawn))
    for cause in causes:
        table.add_row(cause, *(_share(figure, cause) for figure in drawn.values()))
    sums = (f"{si(figure.u or 0.0, figure.unit, 2)}" for figure in drawn.values())
    table.add_row("together (root sum of squares)", *sums)
    return _rendered(table)


def _share(figure: Figure, cause: str) -> str:
    """Write what one cause contributes, and its degrees of freedom where they are few."""
    term = next((term for term in figure.terms if term.name == cause), None)
    # A thousandth of the whole does not show in a root sum of squares.
    if term is None or term.u < 1e-3 * (figure.u or 0.0):
        return "-"
    dof = f" (dof {term.dof:.0f})" if math.isfinite(term.dof) else ""
    return f"{si(term.u, figure.unit, 2)}{dof}"


def verdict_table(verdict: Verdict) -> str:
    """Write a verdict line by line, then the rule, or each line's own where they differ."""
    table = _table("line", "limits", "value (u)", "U", "inside with", "verdict")
    rules = [_rule(line) for line in verdict.lines]
    for line, rule in zip(verdict.lines, rules, strict=True):
        probability = line.conformance_probability
        own = f" ({rule})" if len(set(rules)) > 1 else ""
        table.add_row(
            figure_words(line.figure),
            _limits(line),
            _value(line),
            "" if not line.U else si(line.U, line.unit, 2),
            "" if probability is None else _percent(probability),
            line.verdict.upper() + own,
        )
    same = f"\nrule: {rules[0]}" if len(set(rules)) == 1 else ""
    return _rendered(table) + same


def figure_words(name: str) -> str:
    """Return what people call a figure."""
    return _SHOWN.get(name, name)


def _rule(line: LineVerdict) -> str:
    if line.rule == "simple":
        return "simple"
    return f"{line.rule}, guard band {plain(line.guard)} U"


def history_table(rows: Sequence[HistoryRow]) -> str:
    """Write sweeps, oldest first: figures with their expanded uncertainty, and the verdict."""
    table = _table(
        "when (UTC)", "serial", "design", "gain +- U", "corner +- U", "GBW +- U", "verdict", "sweep"
    )
    for row in rows:
        figures = row.figures
        word = row.verdict.overall.upper() if row.verdict else row.state
        table.add_row(
            row.started_at[:16].replace("T", " "),
            row.serial,
            f"{row.design_name} {row.design_revision}" if row.design_name else "-",
            _expanded(figures.gain_db if figures else None),
            _expanded(figures.corner_hz if figures else None),
            _expanded(figures.gbw_hz if figures else None),
            word,
            row.sweep[:8] + (" SIM" if row.simulated else ""),
        )
    note = "\nSIM: simulated on a practice bench" if any(row.simulated for row in rows) else ""
    return _rendered(table) + note


def plain_table(columns: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    """Write any rows of text under their headings."""
    table = _table(*columns)
    for row in rows:
        table.add_row(*row)
    return _rendered(table)


def _expanded(figure: Figure | None) -> str:
    """Write a figure with its expanded uncertainty: ``"32.074 +- 0.009 dB"``."""
    if figure is None or not figure.U:
        return figure_text(figure)
    number, _, rest = with_uncertainty(figure.value, figure.U, figure.unit).partition("(")
    digits, _, unit = rest.partition(")")
    decimals = len(number.partition(".")[2])
    spread = digits if "." in digits else f"{int(digits) / 10**decimals:.{decimals}f}"
    return f"{number} +- {spread}{unit}"


def _value(line: LineVerdict) -> str:
    if line.value is None:
        return "-"
    if line.basis == "bound":
        return f"bound {si(line.value, line.unit)}"
    return with_uncertainty(line.value, line.u, line.unit)


def _limits(line: LineVerdict) -> str:
    if line.minimum is None and line.maximum is not None:
        return f"<= {si(line.maximum, line.unit)}"
    if line.maximum is None and line.minimum is not None:
        return f">= {si(line.minimum, line.unit)}"
    return f"{si(line.minimum or 0.0, line.unit)} .. {si(line.maximum or 0.0, line.unit)}"


def _percent(probability: float) -> str:
    """Write a probability; certainty is never claimed by rounding."""
    if probability > 0.9999:
        return "> 99.99 %"
    return "< 0.01 %" if probability < 0.0001 else f"{100.0 * probability:.2f} %"


def _table(*columns: str) -> Table:
    table = Table(box=box.SIMPLE_HEAD, pad_edge=False, show_edge=False)
    for column in columns:
        table.add_column(column, overflow="fold")
    return table


def _rendered(table: Table) -> str:
    """Return a table as plain text: what is piped or logged has no colours in it."""
    page = io.StringIO()
    Console(file=page, width=_WIDTH + 40, color_system=None, legacy_windows=False).print(table)
    return "\n".join(line.rstrip() for line in page.getvalue().splitlines())
