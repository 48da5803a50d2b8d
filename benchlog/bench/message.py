"""Messages of a driver: plain text with named fields, and nothing that could be a program.

Driver files come from anywhere.  Their text is never handed to ``str.format`` and never
evaluated: a field is one of the known names in braces, and every other brace is refused.
"""

import re
from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal
from typing import Literal, TypeAlias

from benchlog.errors import DriverFileError, Misuse

ReplyKind: TypeAlias = Literal["none", "done", "number", "error"]
NumberFormat: TypeAlias = Literal["plain", "scientific"]

_FIELD = re.compile(r"\{([a-z_]*)\}")
_LONGEST_LINE = 200


@dataclass(frozen=True, slots=True, kw_only=True)
class Message:
    """What is sent for one action, in one write, and what kind of answer comes back.

    Attributes:
        lines: Program messages in order; only the last may be a query.
        reply: Kind of the answer.
        timeout_s: How long the answer may take, seconds.
    """

    lines: tuple[str, ...]
    reply: ReplyKind
    timeout_s: float

    def text(self, fields: Mapping[str, float], *, form: "NumberForm") -> str:
        """Return the text to send, lines joined by newlines.

        Args:
            fields: Value of each field that the lines name.
            form: How numbers are written.

        Raises:
            Misuse: A line names a field that was not given.
        """

        def written(found: re.Match[str]) -> str:
            if found[1] not in fields:
                raise Misuse(f"no value was given for {found[0]}")
            return form.write(fields[found[1]])

        return "\n".join(_FIELD.sub(written, line) for line in self.lines)


@dataclass(frozen=True, slots=True, kw_only=True)
class NumberForm:
    """How an instrument wants its numbers: always a decimal point, never a locale's comma."""

    style: NumberFormat = "plain"
    digits: int = 9

    def write(self, value: float) -> str:
        """Return the number as text."""
        if self.style == "scientific":
            return f"{value:.{self.digits - 1}E}"
        return format(Decimal(f"{value:.{self.digits}g}"), "f")


def check_lines(
    lines: tuple[str, ...], *, known: frozenset[str], reply: ReplyKind, where: str
) -> None:
    """Refuse lines that are no plain messages.

    Args:
        lines: As the file gives them.
        known: Names of the fields that this message may use.
        reply: Kind of answer that is expected.
        where: File and key path.

    Raises:
        DriverFileError: No line, a line break or control character inside one, an unknown field,
            a query before the last line, or a query where no answer is expected (or the reverse).
    """
    if not lines:
        raise DriverFileError("the message has no line", where=where, expected="at least one")
    for line in lines:
        _check_line(line, known, where)
    if any("?" in line for line in lines[:-1]) or lines[-1].count("?") > 1:
        raise DriverFileError(
            "the message asks more than one question",
            where=where,
            expected="one query, on the last line: two answers would be mistaken for each other",
        )
    if ("?" in lines[-1]) != (reply != "none"):
        told = "asks a question" if "?" in lines[-1] else "asks nothing"
        raise DriverFileError(
            f"the message {told} but its reply is {reply!r}",
            where=where,
            expected='a query with a reply, or no query with reply = "none"',
        )


def _check_line(line: str, known: frozenset[str], where: str) -> None:
    if not line or len(line) > _LONGEST_LINE or not (line.isascii() and line.isprintable()):
        raise DriverFileError(
            f"the line {line[:60]!r} cannot be sent",
            where=where,
            expected=f"1 to {_LONGEST_LINE} printable ASCII characters, without line breaks",
        )
    named = set(_FIELD.findall(line))
    without_fields = _FIELD.sub("", line)
    if "{" in without_fields or "}" in without_fields or not named <= known:
        allowed = ", ".join(f"{{{name}}}" for name in sorted(known)) or "no field"
        raise DriverFileError(
            f"the line {line!r} has a field that is not known here",
            where=where,
            expected=f"plain text with {allowed}",
            hint="a field is a bare name in braces; nothing is computed",
        )
