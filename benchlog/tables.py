"""TOML files that people write: read them, and turn what is wrong into one error to act on."""

import difflib
import json
import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Generic, TypeAlias, TypeVar, get_args, get_origin

import msgspec

from benchlog.errors import FileFormatError
from benchlog.quantity import shown
from benchlog.table_types import hints, item_of, keys, leaves, metas, structs

S = TypeVar("S", bound=msgspec.Struct)
Steps: TypeAlias = tuple[str | int, ...]

_LARGEST_BYTES = 1_000_000
_NAMELESS = "a table of tables lacks a name"
_COMPLAINT = re.compile(r"(?P<what>.*?)(?: - at `\$\.?(?P<path>.*)`)?", re.DOTALL)
_QUOTED = re.compile(r"[`'](.*)[`']", re.DOTALL)
_KINDS = {str: "a text", int: "a whole number", float: "a number"}
_LONGEST_KEY = 60


@dataclass(frozen=True, slots=True, kw_only=True)
class FileKind(Generic[S]):
    """A kind of TOML file.

    Attributes:
        noun: How messages call it: ``"design file"``.
        struct: What may stand in it.
        error: What to raise.
        example: A line that could stand in it, for the message about a file that is not TOML.
        hint: What to do when there is no such file.
    """

    noun: str
    struct: type[S]
    error: type[FileFormatError]
    example: str
    hint: str | None = None

    def content(self, path: str | Path) -> bytes:
        """Read a file's bytes.

        Raises:
            FileFormatError: It cannot be read, or is far too large for its kind.
        """
        try:
            with Path(path).open("rb") as file:
                content = file.read(_LARGEST_BYTES + 1)
        except (OSError, ValueError) as error:
            reason = error.strerror if isinstance(error, OSError) else str(error)
            raise self.error(
                f"the {self.noun} cannot be read: {reason}",
                where=str(path),
                expected="a TOML file",
                hint=self.hint,
            ) from error
        if len(content) > _LARGEST_BYTES:
            raise self.error(
                f"the file is too large for a {self.noun}",
                where=str(path),
                expected=f"at most {_LARGEST_BYTES} bytes",
            )
        return content

    def text(self, content: bytes, *, where: str) -> str:
        """Decode a file's bytes.

        Raises:
            FileFormatError: They are not UTF-8; the line is named.
        """
        try:
            return content.decode()
        except UnicodeDecodeError as error:
            line = content[: error.start].count(b"\n") + 1
            raise self.error(
                f"the file is not UTF-8 text: byte {error.object[error.start]:#04x} in line {line}",
                where=f"{where}: line {line}",
                expected="a text file saved as UTF-8",
            ) from error

    def parse(self, text: str) -> S:
        """Read TOML text into the struct.

        Raises:
            FileFormatError: The first thing that is wrong, with its key path counted from 1.
        """
        data = self._tables(text)
        try:
            return msgspec.convert(data, self.struct)
        except msgspec.ValidationError as error:
            raise _Complaint(self, data).about(str(error)) from error

    def _tables(self, text: str) -> dict[str, Any]:
        """Read TOML; some editors put a byte order mark in front, which TOML does not allow."""
        text = text.removeprefix("\ufeff")
        if not text.strip():
            raise self.error("the file is empty", expected=f"a {self.noun} in TOML", hint=self.hint)
        try:
            return tomllib.loads(text)
        except (ValueError, RecursionError) as error:
            reason = str(error) if isinstance(error, ValueError) else "nested too deeply"
            raise self.error(
                f"the file is not TOML: {reason}",
                expected=f"keys and values such as {self.example}",
            ) from error


def spoken(steps: Steps) -> str:
    """Write a key path as people count: ``stage[1].feedback``."""
    text = "".join(
        f"[{step + 1}]" if isinstance(step, int) else f".{_legible(step)}" for step in steps
    )
    return text.removeprefix(".")


class _Complaint(Generic[S]):
    """Puts what msgspec finds wrong into the words of the file."""

    def __init__(self, kind: FileKind[S], data: Mapping[str, Any]) -> None:
        self.kind = kind
        self.data = data

    def about(self, complaint: str) -> FileFormatError:
        try:
            what, steps = self._place(complaint)
            return self._translated(what, steps)
        except (LookupError, TypeError, AttributeError):
            # A key with brackets or backticks in it defeats the reading of msgspec's own message.
            return self.kind.error(complaint, expected="keys of letters, digits, _ and -")

    def _translated(self, what: str, steps: Steps) -> FileFormatError:
        """Say in our words what msgspec says about the value at a place."""
        if what == _NAMELESS or _is_mapping(self._hint_at(steps)):
            return self.kind.error(
                f"the {steps[-1]} has no name",
                where=spoken(steps),
                expected=f"a table for each {steps[-1]}, for example [{spoken(steps)}.main]",
            )
        quoted = _QUOTED.search(what)
        name = quoted.group(1) if quoted else ""
        if "unknown field" in what:
            return self._unknown_key(name, steps)
        if "missing required field" in what:
            return self.kind.error(
                f"{spoken((*steps, name))} is missing",
                where=spoken((*steps, name)),
                expected=self._wanted((*steps, name)),
            )
        if what.startswith("Invalid") and self._words(steps):
            return self._unknown_word(name, steps)
        told = _told(_value_at(steps, self.data))
        limit = what.removeprefix("Expected ").split(", got")[0]
        return self.kind.error(
            f"{spoken(steps) or 'the file'} is {told}",
            where=spoken(steps),
            expected=self._wanted(steps) or limit,
        )

    def _place(self, complaint: str) -> tuple[str, Steps]:
        what, path = _parted(complaint)
        before, inside, _ = path.partition("[...]")
        if not inside:
            return what, _steps(path)
        # msgspec does not name the keys of a mapping: find the one that is wrong.
        steps = _steps(before)
        item = item_of(self._hint_at(steps))
        tables = _value_at(steps, self.data)
        if set(tables) & set(keys(structs(item)[0])):
            return _NAMELESS, steps
        for name, value in tables.items():
            try:
                msgspec.convert(value, type=item)
            except msgspec.ValidationError as error:
                inner, rest = _parted(str(error))
                return inner, (*steps, name, *_steps(rest))
        return what, steps

    def _unknown_key(self, name: str, steps: Steps) -> FileFormatError:
        known = sorted(keys(self._struct_at(steps)))
        return self.kind.error(
            f"{spoken((*steps, name))} is not a key that a {self.kind.noun} has",
            where=spoken((*steps, name)),
            expected=f"one of: {', '.join(known)}",
            hint=_nearest(name, known),
        )

    def _unknown_word(self, name: str, steps: Steps) -> FileFormatError:
        words = self._words(steps)
        return self.kind.error(
            f"{spoken(steps)}: {shown(name)} is not a word for it",
            where=spoken(steps),
            expected=f"one of: {', '.join(words)}",
            hint=_nearest(name, words),
        )

    def _words(self, steps: Steps) -> list[str]:
        """Return the words allowed at a place: tags of tables, or the values of a literal."""
        tables = structs(self._hint_at(steps[:-1]))
        if tables and steps[-1] == tables[0].__struct_config__.tag_field:
            return [str(one.__struct_config__.tag) for one in tables]
        hint = self._hint_at(steps)
        return [json.dumps(word)[1:-1] for word in leaves(hint) if isinstance(word, str)]

    def _wanted(self, steps: Steps) -> str | None:
        """Say what belongs at a place, with an example."""
        tables = structs(self._hint_at(steps[:-1])) if steps else []
        if tables and steps[-1] == tables[0].__struct_config__.tag_field:
            return f"one of: {', '.join(self._words(steps))}"
        hint = self._hint_at(steps)
        for meta in metas(hint):
            if meta.examples:
                return f"{meta.description}, for example {json.dumps(meta.examples[0])}"
            if meta.description:
                return str(meta.description)
        inner = structs(hint)
        if inner:
            return f"a table with the keys {', '.join(keys(inner[0]))}"
        words = [word for word in leaves(hint) if isinstance(word, str)]
        return f"one of: {', '.join(words)}" if words else None

    def _hint_at(self, steps: Steps) -> object:
        """Return the type of what belongs at a place."""
        if not steps:
            return self.kind.struct
        *before, last = steps
        holder = self._hint_at(tuple(before))
        if isinstance(last, int) or not structs(holder) or _is_mapping(holder):
            return item_of(holder)
        return hints(self._struct_at(tuple(before))).get(last)

    def _struct_at(self, steps: Steps) -> type[msgspec.Struct]:
        """Return the struct that describes the table at a place."""
        tables = structs(self._hint_at(steps))
        value = _value_at(steps, self.data)
        tag_field = tables[0].__struct_config__.tag_field
        tag = value.get(tag_field) if tag_field and isinstance(value, Mapping) else None
        return next((one for one in tables if one.__struct_config__.tag == tag), tables[0])


def _is_mapping(hint: object) -> bool:
    return get_origin(hint) is dict or any(_is_mapping(part) for part in get_args(hint))


def _parted(complaint: str) -> tuple[str, str]:
    found = _COMPLAINT.fullmatch(complaint)
    return (found["what"], found["path"] or "") if found else (complaint, "")


def _steps(path: str) -> Steps:
    """Split ``stage[0].feedback`` into ``("stage", 0, "feedback")``."""
    return tuple(int(step) if step.isdecimal() else step for step in re.findall(r"[^.\[\]]+", path))


def _nearest(name: str, known: list[str]) -> str | None:
    near = difflib.get_close_matches(name, known, n=1)
    return f"did you mean {near[0]!r}?" if near else None


def _told(value: object) -> str:
    if isinstance(value, list):
        return "a list" if value else "an empty list"
    if isinstance(value, Mapping):
        return "a table"
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, str | int | float):
        return f"{_KINDS[type(value)]}: {shown(value)}"
    return f"a date or a time: {value}"


def _legible(key: str) -> str:
    """Return a key as it may be shown on a terminal."""
    return key if key.isprintable() and len(key) <= _LONGEST_KEY else shown(key)


def _value_at(steps: Steps, data: Any) -> Any:  # noqa: ANN401 - TOML data
    for step in steps:
        data = data[step]
    return data
