"""Program messages as IEEE 488.2 writes them: units, headers and typed data elements.

Pure text in, frozen records out; a message that breaks the grammar raises ``ScpiError`` with the
standard's number.  Nothing here knows which commands exist.
"""

import re
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal, TypeAlias

from benchlog.practice.error_table import ScpiError

Kind: TypeAlias = Literal["number", "word", "string", "block", "expression"]

# IEEE 488.2, 7.4.1.2: every control character but the terminator is white space.
_CONTROLS = dict.fromkeys((*range(32), 127), " ")

_HEADER = re.compile(
    r"(?P<star>\*)?(?P<root>:)?(?P<path>[A-Za-z][\w]*(?::[A-Za-z]\w*)*)(?P<query>\?)?"
)
_NUMBER = re.compile(
    r"(?P<mantissa>[+-]?(?:\d+\.?\d*|\.\d+))(?:\s*[Ee]\s*(?P<exponent>[+-]?\d+))?"
    r"(?:\s*(?P<suffix>[A-Za-z/][A-Za-z0-9/.\-^]*))?"
)
_WORD = re.compile(r"[A-Za-z]\w*")
_UP_TO_SEPARATOR = re.compile(r"[\s,]")
_STRING = re.compile(r"\"((?:[^\"]|\"\")*)\"|'((?:[^']|'')*)'")
_COUNTED = re.compile(r"#(?:[Hh](?P<hex>[0-9A-Fa-f]+)|[Qq](?P<oct>[0-7]+)|[Bb](?P<bin>[01]+))")
_EXPRESSION = re.compile(r"\([^()\"']*\)")

LONGEST_WORD = 12
MOST_DIGITS = 255
LARGEST_EXPONENT = 32_000


@dataclass(frozen=True, slots=True, kw_only=True)
class Element:
    """One data element.

    Attributes:
        kind: What the grammar calls it.
        text: Number without its suffix, word in capitals, contents of a string, or as written.
        suffix: Unit with multiplier in capitals, empty where there is none.
    """

    kind: Kind
    text: str
    suffix: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Unit:
    """One program message unit: ``SOUR:FREQ 1 kHz``.

    Attributes:
        mnemonics: The header's words in capitals, ``("SOUR", "FREQ")`` or ``("*IDN",)``.
        rooted: True when the header began with a colon.
        query: True when it ended with a question mark.
        elements: The data elements that follow.
    """

    mnemonics: tuple[str, ...]
    rooted: bool
    query: bool
    elements: tuple[Element, ...]

    @property
    def common(self) -> bool:
        """Tell whether this is a common command, which leaves the header path alone."""
        return self.mnemonics[0].startswith("*")


def split_units(message: str) -> Iterator[str]:
    """Yield the program message units between semicolons; strings and blocks stay whole.

    Raises:
        ScpiError: A string is not closed (-151).
    """
    text = message.translate(_CONTROLS)
    start = place = 0
    while place < len(text):
        if text[place] in "\"'":
            place = _end_of_string(text, place)
        elif text[place] == "#":
            place = max(_end_of_block(text, place), place + 1)
        elif text[place] == ";":
            yield text[start:place]
            start = place = place + 1
        else:
            place += 1
    yield text[start:]


def parse_unit(text: str) -> Unit | None:
    """Read one program message unit; None when there is nothing but white space.

    Raises:
        ScpiError: The header or a data element breaks the grammar (-100 to -178).
    """
    text = text.strip()
    if not text:
        return None
    if not text.isascii():
        raise ScpiError(-101)
    header = _HEADER.match(text)
    if header is None or (header["star"] and (header["root"] or ":" in header["path"])):
        raise ScpiError(-102)
    mnemonics = tuple(header["path"].upper().split(":"))
    if any(len(mnemonic) > LONGEST_WORD for mnemonic in mnemonics):
        raise ScpiError(-112)
    rest = text[header.end() :]
    if rest and not rest[0].isspace():
        raise ScpiError(-101 if rest[0] in "$%&@!^`~{}|\\" else -111)
    return Unit(
        mnemonics=("*" + mnemonics[0],) if header["star"] else mnemonics,
        rooted=header["root"] is not None,
        query=header["query"] is not None,
        elements=tuple(_elements(rest)),
    )


def _elements(text: str) -> Iterator[Element]:
    rest = text.strip()
    while rest:
        element, length = _element(rest)
        yield element
        rest = rest[length:].lstrip()
        if not rest:
            return
        if rest[0] != ",":
            raise ScpiError(-103)
        rest = rest[1:].lstrip()
        if not rest:
            raise ScpiError(-102)


def _element(text: str) -> tuple[Element, int]:
    first = text[0]
    if first.isdigit() or first in "+-.":
        return _number(text)
    if first.isalpha():
        return _word(text)
    if first in "\"'":
        end = _end_of_string(text, 0)
        inner = text[1 : end - 1].replace(first * 2, first)
        return Element(kind="string", text=inner), end
    if first == "#":
        return _counted(text)
    if first == "(":
        return _expression(text)
    raise ScpiError(-102)


def _number(text: str) -> tuple[Element, int]:
    match = _NUMBER.match(text)
    if match is None:
        raise ScpiError(-121)
    end = match.end()
    if end < len(text) and not text[end].isspace() and text[end] != ",":
        raise ScpiError(-121)
    mantissa, exponent, suffix = match["mantissa"], match["exponent"] or "0", match["suffix"] or ""
    if len(mantissa.strip("+-").replace(".", "").lstrip("0")) > MOST_DIGITS:
        raise ScpiError(-124)
    if len(exponent.lstrip("+-0")) > 5 or abs(int(exponent)) > LARGEST_EXPONENT:
        raise ScpiError(-123)
    if len(suffix) > LONGEST_WORD:
        raise ScpiError(-134)
    return Element(kind="number", text=f"{mantissa}E{exponent}", suffix=suffix.upper()), end


def _word(text: str) -> tuple[Element, int]:
    word = _UP_TO_SEPARATOR.split(text, maxsplit=1)[0]
    if not _WORD.fullmatch(word):
        raise ScpiError(-141)
    if len(word) > LONGEST_WORD:
        raise ScpiError(-144)
    return Element(kind="word", text=word.upper()), len(word)


def _counted(text: str) -> tuple[Element, int]:
    match = _COUNTED.match(text)
    if match is not None:
        digits, base = next(
            (match[name], base)
            for name, base in (("hex", 16), ("oct", 8), ("bin", 2))
            if match[name]
        )
        return Element(kind="number", text=str(int(digits, base))), match.end()
    end = _end_of_block(text, 0)
    if end <= 0:
        raise ScpiError(-161)
    return Element(kind="block", text=text[:end]), end


def _expression(text: str) -> tuple[Element, int]:
    match = _EXPRESSION.match(text)
    if match is None:
        raise ScpiError(-171)
    return Element(kind="expression", text=match[0]), match.end()


def _end_of_string(text: str, start: int) -> int:
    match = _STRING.match(text, start)
    if match is None:
        raise ScpiError(-151)
    return match.end()


def _end_of_block(text: str, start: int) -> int:
    """Return where a definite-length block ends, or 0 when there is none at ``start``."""
    size = text[start + 1 : start + 2]
    if not size.isdigit() or size == "0":
        return 0
    first = start + 2 + int(size)
    count = text[start + 2 : first]
    if not count.isdigit() or first + int(count) > len(text):
        return 0
    return first + int(count)
