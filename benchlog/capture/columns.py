"""What the columns of a table are, by their names and units."""

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Literal, TypeAlias

from benchlog.errors import CaptureError

Kind: TypeAlias = Literal["frequency", "gain", "input", "output", "phase", "u_gain"]

# log10(f), log10 f, log10(f/Hz), log frequency: of hertz and of no other unit.
_LOG_FREQUENCY = r"(log|log10|lg)( ?\( ?f\w* ?([/\[(] ?hz ?[\])]?)? ?\)| f\w*)"

KINDS: dict[Kind, tuple[str, ...]] = {
    "u_gain": (r"u_gain\w*", r"u\(gain\)", r"gain uncertainty"),
    "frequency": (r"freq\w*", r"f", r"hz", _LOG_FREQUENCY),
    "gain": (r"gain\w*", r"mag\w*", r"ratio", r"amplification", r"\|?h\|?", r"a_?v", r"verst\w+"),
    "input": (r"in", r"in_\w+", r"inp\w*", r"v_?in\w*", r"u_?in\w*", r"eingang\w*", r"vi", r"ein"),
    "output": (
        r"out", r"out_\w+", r"outp\w*", r"v_?out\w*", r"u_?out\w*", r"ausgang\w*", r"vo", r"aus",
    ),
    "phase": (r"ph", r"pha\w*", r"phi\w*", r"arg\w*"),
}  # fmt: skip
UNITS: dict[Kind, tuple[str, ...]] = {
    "frequency": ("Hz", "kHz", "MHz", "GHz", "log10(Hz)"),
    "gain": ("V/V", "dB"),
    "input": ("Vrms", "mVrms", "Vpp", "mVpp", "Vpk", "mVpk", "V", "mV", "dBV", "dBu", "dBm"),
    "output": ("Vrms", "mVrms", "Vpp", "mVpp", "Vpk", "mVpk", "V", "mV", "dBV", "dBu", "dBm"),
    "phase": ("deg", "rad"),
    "u_gain": ("rel", "%", "dB"),
}
_ALIKE = {
    "°": "deg", "degree": "deg", "degrees": "deg", "grad": "deg", "radian": "rad",
    "radians": "rad", "ratio": "V/V", "v/v": "V/V", "1": "V/V", "lin": "V/V", "x": "V/V",
    "log10": "log10(Hz)", "log10 hz": "log10(Hz)", "log": "log10(Hz)", "vp": "Vpk",
    "vpeak": "Vpk", "veff": "Vrms", "rel": "rel", "relative": "rel",
}  # fmt: skip
_IN_BRACKETS = re.compile(r"^(.*?)\s*[\(\[]\s*([^\)\]]+?)\s*[\)\]]\s*$")
_BEHIND_SLASH = re.compile(r"^(.*?)\s+/\s+(\S+)$")
_BEHIND_BLANK = re.compile(
    r"^(.*\S)\s+(?:in\s+)?"
    r"(Hz|kHz|MHz|GHz|V/V|dB|dBV|dBu|dBm|m?V(?:rms|pp|pk)?|deg|°|rad|%|[mun]?s)$"
)
_HOUSE = re.compile(r"^(.*)_(hz|khz|mhz|db|vrms|vpp|vpk|deg|rad|rel|v|dbv|dbu|dbm)$", re.IGNORECASE)


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """One column that is used: its place counted from 0, its kind and its unit."""

    place: int
    kind: Kind
    unit: str
    name: str


def find_columns(
    header: Sequence[Sequence[str]], width: int, *, asked: Mapping[str, str]
) -> tuple[Column, ...]:
    """Return the columns that are used.

    Args:
        header: Rows of words above the numbers, top first; none, one, or names and units.
        width: Columns of the block.
        asked: Units that a person gave, by kind or by column name.

    Raises:
        CaptureError: A column is missing, doubled, or has no unit.
    """
    named = _named(header, width, asked)
    columns: dict[Kind, Column] = {}
    house = any(name.lower() == "frequency_hz" for name, _ in named)
    for place, (name, told) in enumerate(named):
        kind = kind_of(name)
        if kind is None:
            continue
        if kind in columns:
            raise CaptureError(
                f"two columns look like {kind}: {columns[kind].name!r} and {name!r}",
                where=f"column {place + 1}",
                expected="one column of each kind",
                hint="rename the one that is not meant",
            )
        unit = _unit(kind, name, told, asked=asked, house=house)
        columns[kind] = Column(place=place, kind=kind, unit=unit, name=name)
    _check_complete(columns, named)
    return tuple(columns.values())


def _named(
    header: Sequence[Sequence[str]], width: int, asked: Mapping[str, str]
) -> list[tuple[str, str]]:
    """Return name and unit of each column, as far as the file gives them."""
    if not header:
        if len(asked) == width:
            return [(name, "") for name in asked]
        raise CaptureError(
            "the columns have no names",
            where="above the first row of numbers",
            expected="a header such as frequency_hz,gain_db",
            hint=f"or one --unit for each of the {width} columns, in order:"
            " --unit frequency=Hz --unit gain=dB",
        )
    names, units = header[-1], [""] * width
    if len(header) == 2 and any(kind_of(split_name(cell)[0]) for cell in header[0]):
        names, units = header[0], list(header[1])
    return [
        (name, unit.strip("()[] ") or inner)
        for (name, inner), unit in zip(map(split_name, names), units, strict=True)
    ]


def split_name(cell: str) -> tuple[str, str]:
    """Split ``"Gain (dB)"``, ``"f / Hz"`` and ``"Gain in dB"`` into name and unit."""
    if re.match(r"(log|log10|lg)\b", cell.strip(), re.IGNORECASE) and kind_of(cell):
        return cell.strip(), ""
    for form in (_IN_BRACKETS, _BEHIND_SLASH, _BEHIND_BLANK):
        found = form.match(cell)
        if found and found[1]:
            return found[1].rstrip(" /").strip(), found[2].strip()
    return cell.strip(), ""


def kind_of(name: str) -> Kind | None:
    """Return what a column of this name holds; None where the name says nothing."""
    plain = re.sub(r"[\s.\-]+", "_", name.strip().lower()).strip("_")
    spaced = plain.replace("_", " ")
    for kind, patterns in KINDS.items():
        if any(re.fullmatch(p, plain) or re.fullmatch(p, spaced) for p in patterns):
            return kind
    return None


def _unit(kind: Kind, name: str, told: str, *, asked: Mapping[str, str], house: bool) -> str:
    given = asked.get(kind) or asked.get(name) or told
    found = _HOUSE.match(name)
    if not given and found:
        given = found[2]
    if kind == "frequency" and name.lower().startswith(("log", "lg")):
        given = "log10(Hz)"
    if not given and kind == "gain" and house and name.lower() == "gain":
        # This program's own names say it: gain is V/V.
        given = "V/V"
    unit = _known(kind, given)
    if unit is not None:
        return unit
    what = f"has the unit {given!r}, which is not known here" if given else "has no unit"
    raise CaptureError(
        f"the column {name!r} {what}",
        where=f"column {name!r}",
        expected=f"one of: {', '.join(UNITS[kind])}",
        hint=f"say it with --unit {kind}={UNITS[kind][0]} (or another of these)",
    )


def _known(kind: Kind, given: str) -> str | None:
    """Return a unit in its own spelling; None where there is none."""
    text = given.strip()
    alike = _ALIKE.get(text.lower(), text)
    exact = [unit for unit in UNITS[kind] if unit == alike]
    loose = [unit for unit in UNITS[kind] if unit.lower() == alike.lower()]
    if kind == "frequency" and text == "mHz":
        return None
    return next(iter(exact or loose), None)


def is_unit(text: str) -> bool:
    """Tell whether a word is a unit of some column."""
    return any(_known(kind, text) is not None for kind in UNITS)


def _check_complete(columns: Mapping[Kind, Column], named: Sequence[tuple[str, str]]) -> None:
    names = ", ".join(repr(name) for name, _ in named)
    if "frequency" not in columns:
        raise CaptureError(
            "there is no frequency column",
            where=f"header: {names}",
            expected='a column such as frequency_hz or "Frequency (kHz)"',
        )
    both = "input" in columns and "output" in columns
    if "gain" not in columns and not both:
        raise CaptureError(
            "there is neither a gain column nor both an input and an output column",
            where=f"header: {names}",
            expected='a column such as gain_db, or two such as "Vin (Vpp)" and "Vout (Vpp)"',
        )
    if "gain" not in columns and _is_log(columns["input"]) != _is_log(columns["output"]):
        return
    if "gain" in columns and both:
        raise CaptureError(
            "there is a gain column and also input and output columns",
            where=f"header: {names}",
            expected="one or the other: they could contradict each other",
            hint="remove the columns that are not meant",
        )


def _is_log(column: Column) -> bool:
    return column.unit.startswith("dB")
