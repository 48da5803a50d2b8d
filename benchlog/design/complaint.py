"""Turn what msgspec finds wrong in a design file into one error that a person can act on."""

import difflib
import json
import re
from collections.abc import Mapping
from typing import Any

import msgspec

from benchlog.design.file import AmplifierFile, DesignFile
from benchlog.design.keys import hints, item_of, keys, leaves, metas, structs
from benchlog.errors import DesignFileError
from benchlog.quantity import shown

_COMPLAINT = re.compile(r"(?P<what>.*?)(?: - at `\$\.?(?P<path>.*)`)?", re.DOTALL)
_QUOTED = re.compile(r"[`'](.*)[`']", re.DOTALL)
_KINDS = {str: "a text", int: "a whole number", float: "a number"}


def convert(data: Mapping[str, Any]) -> DesignFile:
    """Check a design file's data against the keys there are.

    Raises:
        DesignFileError: The first thing that is wrong, with its key path counted from 1.
    """
    try:
        return msgspec.convert(data, DesignFile)
    except msgspec.ValidationError as error:
        raise _complaint(error, data) from error


def _complaint(error: msgspec.ValidationError, data: Mapping[str, Any]) -> DesignFileError:
    what, path = _parted(str(error))
    steps = _steps(path)
    try:
        if steps[:1] == ("amplifier",):
            return _amplifier_complaint(data)
        return _translated(what, steps, data)
    except (LookupError, TypeError):
        # A key with brackets or backticks in it defeats the reading of msgspec's own message.
        return DesignFileError(str(error), expected="keys of letters, digits, _ and -")


def _translated(
    what: str, steps: tuple[str | int, ...], data: Mapping[str, Any]
) -> DesignFileError:
    """Say in our words what msgspec says about the value at a place."""
    quoted = _QUOTED.search(what)
    name = quoted.group(1) if quoted else ""
    if "unknown field" in what:
        return _unknown_key(name, steps, data)
    if "missing required field" in what:
        return DesignFileError(
            f"{_spoken((*steps, name))} is missing",
            where=_spoken((*steps, name)),
            expected=_wanted((*steps, name), data),
        )
    if what.startswith("Invalid"):
        return _unknown_word(name, steps, data)
    told = _told(_value_at(steps, data))
    return DesignFileError(
        f"{_spoken(steps) or 'the file'} is {told}",
        where=_spoken(steps),
        expected=_wanted(steps, data),
    )


def _parted(complaint: str) -> tuple[str, str]:
    found = _COMPLAINT.fullmatch(complaint)
    return (found["what"], found["path"] or "") if found else (complaint, "")


def _amplifier_complaint(data: Mapping[str, Any]) -> DesignFileError:
    """Find the amplifier table that is wrong: msgspec does not name the keys of a mapping."""
    tables = data["amplifier"]
    named = isinstance(tables, Mapping) and not set(tables) & set(keys(AmplifierFile))
    for name, table in tables.items() if named else ():
        try:
            msgspec.convert(table, AmplifierFile)
        except msgspec.ValidationError as error:
            what, path = _parted(str(error))
            return _translated(what, ("amplifier", name, *_steps(path)), data)
    return DesignFileError(
        "the amplifier has no name",
        where="amplifier",
        expected="a table for each amplifier, for example [amplifier.main]",
    )


def _steps(path: str) -> tuple[str | int, ...]:
    """Split ``stage[0].feedback`` into ``("stage", 0, "feedback")``."""
    return tuple(int(step) if step.isdecimal() else step for step in re.findall(r"[^.\[\]]+", path))


def _spoken(steps: tuple[str | int, ...]) -> str:
    """Write a key path as people count: ``stage[1].feedback``."""
    text = "".join(
        f"[{step + 1}]" if isinstance(step, int) else f".{_legible(step)}" for step in steps
    )
    return text.removeprefix(".")


def _legible(key: str) -> str:
    """Return a key as it may be shown on a terminal."""
    return key if key.isprintable() and len(key) <= 60 else shown(key)


def _unknown_key(name: str, steps: tuple[str | int, ...], data: object) -> DesignFileError:
    known = sorted(keys(_struct_at(steps, data)))
    near = difflib.get_close_matches(name, known, n=1)
    return DesignFileError(
        f"{_spoken((*steps, name))} is not a key that a design file has",
        where=_spoken((*steps, name)),
        expected=f"one of: {', '.join(known)}",
        hint=f"did you mean {near[0]!r}?" if near else None,
    )


def _unknown_word(name: str, steps: tuple[str | int, ...], data: object) -> DesignFileError:
    words = _words(steps, data)
    near = difflib.get_close_matches(name, words, n=1)
    return DesignFileError(
        f"{_spoken(steps)}: {shown(name)} is not a word for it",
        where=_spoken(steps),
        expected=f"one of: {', '.join(words)}",
        hint=f"did you mean {near[0]!r}?" if near else None,
    )


def _words(steps: tuple[str | int, ...], data: object) -> list[str]:
    """Return the words allowed at a place: topologies, or the values of a literal type."""
    if steps[-1] == "topology":
        return [str(one.__struct_config__.tag) for one in structs(hints(DesignFile)["stage"])]
    return [str(word) for word in leaves(_hint_at(steps, data)) if isinstance(word, str)]


def _wanted(steps: tuple[str | int, ...], data: object) -> str | None:
    """Say what belongs at a place, with an example."""
    if steps and steps[-1] == "topology":
        return f"one of: {', '.join(_words(steps, data))}"
    hint = _hint_at(steps, data)
    for meta in metas(hint):
        if meta.examples:
            return f"{meta.description}, for example {json.dumps(meta.examples[0])}"
        if meta.description:
            return str(meta.description)
    tables = structs(hint)
    if tables:
        return f"a table with the keys {', '.join(keys(tables[0]))}"
    words = [word for word in leaves(hint) if isinstance(word, str)]
    return f"one of: {', '.join(words)}" if words else None


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


def _value_at(steps: tuple[str | int, ...], data: Any) -> object:  # noqa: ANN401 - TOML data
    for step in steps:
        data = data[step]
    return data


def _hint_at(steps: tuple[str | int, ...], data: object) -> object:
    """Return the type of what belongs at a place."""
    if not steps:
        return DesignFile
    *before, last = steps
    if isinstance(last, int):
        return item_of(_hint_at(tuple(before), data))
    if before == ["amplifier"]:
        return AmplifierFile
    return hints(_struct_at(tuple(before), data)).get(last)


def _struct_at(steps: tuple[str | int, ...], data: object) -> type[msgspec.Struct]:
    """Return the struct that describes the table at a place."""
    tables = structs(_hint_at(steps, data))
    value = _value_at(steps, data)
    tag = value.get("topology") if isinstance(value, Mapping) else None
    return next((one for one in tables if one.__struct_config__.tag == tag), tables[0])
