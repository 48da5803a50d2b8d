"""Driver files: find, read and check them."""

import hashlib
from collections.abc import Callable
from pathlib import Path

from benchlog.bench.driver import (
    MESSAGES,
    OPTIONAL,
    Accuracy,
    Driver,
    LinkSettings,
    Settling,
)
from benchlog.bench.driver_file import DriverFile, ExampleTable
from benchlog.bench.message import Message, NumberForm, check_lines
from benchlog.bench.reply import NumberGrammar
from benchlog.errors import DriverFileError, QuantityError
from benchlog.folders import data_folder
from benchlog.quantity import hertz, level_vrms, percent, second
from benchlog.tables import FileKind

KIND = FileKind(
    noun="driver file",
    struct=DriverFile,
    error=DriverFileError,
    example='role = "source"',
    hint="`benchlog driver list` names those that are shipped",
)


def list_drivers() -> tuple[str, ...]:
    """Return the names of the shipped drivers, sorted."""
    files = (entry.name for entry in data_folder("drivers").iterdir())
    return tuple(sorted(name.removesuffix(".toml") for name in files if name.endswith(".toml")))


def read_driver(name: str, *, folder: Path | None = None) -> Driver:
    """Read a shipped driver by its name, or any driver file by its path.

    Args:
        name: ``"meter_generic"``, or a path that ends in ``.toml``.
        folder: What a relative path starts from; the current folder by default.

    Raises:
        DriverFileError: There is no such driver, or its file is wrong.
    """
    return parse_driver(*_content(name, folder))[0]


def read_driver_with_examples(
    name: str, *, folder: Path | None = None
) -> tuple[Driver, tuple[ExampleTable, ...]]:
    """Read a driver and the worked examples that stand in its file; see ``read_driver``."""
    return parse_driver(*_content(name, folder))


def parse_driver(content: bytes, where: str) -> tuple[Driver, tuple[ExampleTable, ...]]:
    """Read a driver from the bytes of its file.

    Raises:
        DriverFileError: What the file says is wrong: file, key path, what was expected.
    """
    text = KIND.text(content, where=where)
    try:
        file = KIND.parse(text)
        return _driver(file, content), tuple(file.example)
    except QuantityError as error:
        raise DriverFileError(
            error.what, where=error.where, expected=error.expected, hint=error.hint
        ).at(where) from error
    except DriverFileError as error:
        raise error.at(where) from error


def _content(name: str, folder: Path | None) -> tuple[bytes, str]:
    if name.endswith(".toml"):
        path = (folder or Path()) / name
        return KIND.content(path), str(path)
    if name not in list_drivers():
        raise DriverFileError(
            f"there is no driver {name!r}",
            where=name,
            expected=f"one of: {', '.join(list_drivers())}, or the path of a driver file",
        )
    file = data_folder("drivers") / f"{name}.toml"
    return file.read_bytes(), f"driver {name}"


def _driver(file: DriverFile, content: bytes) -> Driver:
    timeout_s = second(file.link.timeout, field="link.timeout")
    _check_actions(file)
    return Driver(
        name=file.name,
        role=file.role,
        description=file.description,
        sha256=hashlib.sha256(content).hexdigest(),
        level_unit=file.level_unit,
        link=LinkSettings(
            read_terminator=file.link.read_terminator,
            write_terminator=file.link.write_terminator,
            timeout_s=_above_zero(timeout_s, "link.timeout"),
            gap_s=second(file.link.gap, field="link.gap"),
            after_open_s=second(file.link.after_open, field="link.after_open"),
        ),
        numbers=NumberForm(style=file.numbers.style, digits=file.numbers.digits),
        messages={action: _message(file, action, timeout_s=timeout_s) for action in file.message},
        grammars={
            action: NumberGrammar(
                unit=table.unit,
                overload=frozenset(table.overload),
                not_a_number=frozenset(table.not_a_number),
            )
            for action, table in file.message.items()
        },
        frequency_range_hz=_pair(file.range.frequency, hertz, "range.frequency"),
        level_range_vrms=_level_range(file),
        settling=_settling(file),
        reading_time_s=second(file.reading.time, field="reading.time"),
        reading_cycles=file.reading.cycles,
        accuracy=_accuracy(file),
    )


def _check_actions(file: DriverFile) -> None:
    known = MESSAGES[file.role]
    for action in file.message:
        if action not in known:
            raise DriverFileError(
                f"message.{action} is nothing that a {file.role} is asked for",
                where=f"message.{action}",
                expected=f"one of: {', '.join(known)}",
            )
    for action in known:
        if action not in file.message and action not in OPTIONAL:
            raise DriverFileError(
                f"message.{action} is missing",
                where=f"message.{action}",
                expected=f"what to send so that a {file.role} does it",
            )


def _message(file: DriverFile, action: str, *, timeout_s: float) -> Message:
    table = file.message[action]
    where = f"message.{action}"
    lines = tuple(table.lines)
    known = MESSAGES[file.role][action]
    check_lines(lines, known=known, reply=table.reply, where=f"{where}.lines")
    wanted = {"read": "number", "error": "error"}.get(action)
    if (wanted or table.reply) != table.reply or (table.reply == "number" and action != "read"):
        raise DriverFileError(
            f"{where}.reply is {table.reply!r}",
            where=f"{where}.reply",
            expected=repr(wanted) if wanted else '"none", "done" or "error"',
        )
    if table.timeout is not None:
        timeout_s = second(table.timeout, field=f"{where}.timeout")
    return Message(
        lines=lines,
        reply=table.reply,
        timeout_s=_above_zero(timeout_s, f"{where}.timeout"),
    )


def _level_range(file: DriverFile) -> tuple[float, float] | None:
    if file.range.level is None:
        if file.role == "source":
            raise DriverFileError(
                "range.level is missing",
                where="range.level",
                expected='the lowest and highest level of the source, like ["1 mVrms", "7 Vrms"]',
            )
        return None
    return _pair(file.range.level, level_vrms, "range.level")


def _settling(file: DriverFile) -> tuple[Settling, ...]:
    rows: list[Settling] = []
    for number, table in enumerate(file.settling, start=1):
        field = f"settling[{number}]"
        row = Settling(
            above_hz=hertz(table.above, field=f"{field}.above"),
            time_s=second(table.time, field=f"{field}.time"),
            cycles=table.cycles,
        )
        if rows and row.above_hz <= rows[-1].above_hz:
            raise DriverFileError(
                f"{field}.above does not rise",
                where=f"{field}.above",
                expected="rows by rising frequency",
            )
        rows.append(row)
    return tuple(rows)


def _accuracy(file: DriverFile) -> tuple[Accuracy, ...]:
    return tuple(
        Accuracy(
            band_hz=_pair(table.band, hertz, f"accuracy[{number}].band"),
            limit_rel=percent(table.reading, field=f"accuracy[{number}].reading"),
        )
        for number, table in enumerate(file.accuracy, start=1)
    )


def _pair(texts: list[str], read: Callable[..., float], field: str) -> tuple[float, float]:
    low, high = (read(text, field=f"{field}[{place}]") for place, text in enumerate(texts, start=1))
    if not low < high:
        raise DriverFileError(
            f"{field} does not rise: {texts[0]}, {texts[1]}",
            where=field,
            expected="the lower end first",
        )
    return low, high


def _above_zero(seconds: float, field: str) -> float:
    if seconds <= 0:
        raise DriverFileError(f"{field} is zero", where=field, expected='a time, like "2 s"')
    return seconds
