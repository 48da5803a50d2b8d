"""Replay a driver file's worked examples: what is sent, and what a reply means; no instrument."""

import math
from dataclasses import dataclass
from pathlib import Path

from benchlog.bench.driver import Driver
from benchlog.bench.driver_file import ExampleTable
from benchlog.bench.driver_read import read_driver_with_examples
from benchlog.bench.reply import parse_done, parse_error, parse_number
from benchlog.errors import DriverFileError, Misuse, ReplyError
from benchlog.records import Status


@dataclass(frozen=True, slots=True, kw_only=True)
class ExampleResult:
    """How one worked example came out.

    Attributes:
        example: Its place in the file, counted from 1; 0 for an action without any example.
        message: The action.
        passed: Whether the driver does what the example says.
        expected, got: What the example says, and what the driver does.
    """

    example: int
    message: str
    passed: bool
    expected: str
    got: str


def check_driver(name: str, *, folder: Path | None = None) -> tuple[ExampleResult, ...]:
    """Replay every worked example of a driver.

    Returns:
        One result for each example and direction, and one failed for each action without any.

    Raises:
        DriverFileError: The file itself is wrong, or an example names no action.
    """
    driver, examples = read_driver_with_examples(name, folder=folder)
    results: list[ExampleResult] = []
    for number, example in enumerate(examples, start=1):
        if example.message not in driver.messages:
            raise DriverFileError(
                f"example[{number}].message: there is no message {example.message!r}",
                where=f"{name}: example[{number}].message",
                expected=f"one of: {', '.join(driver.messages)}",
            )
        results += _replay(driver, number, example)
    shown = {example.message for example in examples}
    results += [
        ExampleResult(
            example=0, message=action, passed=False, expected="a worked example", got="none"
        )
        for action in driver.messages
        if action not in shown
    ]
    return tuple(results)


def _replay(driver: Driver, number: int, example: ExampleTable) -> list[ExampleResult]:
    results = []
    if example.sends is not None:
        got = _sent(driver, example)
        results.append(_result(number, example, expected=example.sends, got=got))
    if example.reply is not None:
        expected = "done" if example.means is None else str(example.means)
        results.append(_result(number, example, expected=expected, got=_meaning(driver, example)))
    if not results:
        results.append(
            _result(number, example, expected="sends, or reply with means", got="neither")
        )
    return results


def _result(number: int, example: ExampleTable, *, expected: str, got: str) -> ExampleResult:
    return ExampleResult(
        example=number,
        message=example.message,
        passed=expected == got or _same_number(expected, got),
        expected=expected,
        got=got,
    )


def _same_number(expected: str, got: str) -> bool:
    """Compare a value that went through a conversion of units."""
    try:
        return math.isclose(float(expected), float(got), rel_tol=1e-6)
    except ValueError:
        return False


def _sent(driver: Driver, example: ExampleTable) -> str:
    try:
        return driver.text(
            example.message,
            frequency_hz=example.frequency_hz,
            level_vrms=example.level_vrms,
            load_ohm=example.load_ohm,
        )
    except Misuse as error:
        return str(error)


def _meaning(driver: Driver, example: ExampleTable) -> str:
    """Say in one word or number what a reply means, or that it is refused."""
    reply = example.reply or ""
    try:
        match driver.messages[example.message].reply:
            case "number":
                number = parse_number(reply, driver.grammars[example.message])
                if number.status is not Status.OK or number.value is None:
                    return number.status.value
                return str(driver.to_vrms(number.value))
            case "error":
                entry = parse_error(reply)
                return "no error" if entry.number == 0 else str(entry.number)
            case _:
                parse_done(reply)
                return "done"
    except ReplyError:
        return "refused"
