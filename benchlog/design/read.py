"""Read a design file; whatever is wrong with it becomes one error that says where."""

import tomllib
from pathlib import Path
from typing import Any

from benchlog.design.build import build_design
from benchlog.design.complaint import convert
from benchlog.design.model import Design
from benchlog.errors import DesignFileError, QuantityError

_LARGEST_BYTES = 1_000_000


def read_design(path: str | Path) -> Design:
    """Read a design file.

    Args:
        path: A TOML file in UTF-8.

    Raises:
        DesignFileError: It cannot be read, or what it says is wrong: file, key path counted from
            1 (``stage[2].feedback``), what was expected.
    """
    content = _content(path)
    try:
        text = content.decode()
    except UnicodeDecodeError as error:
        line = content[: error.start].count(b"\n") + 1
        raise DesignFileError(
            f"the file is not UTF-8 text: byte {error.object[error.start]:#04x} in line {line}",
            where=f"{path}: line {line}",
            expected="a text file saved as UTF-8",
        ) from error
    return _parse(text, content, where=str(path))


def parse_design(text: str, *, where: str) -> Design:
    """Read a design from text, as ``read_design`` does from a file.

    Args:
        text: TOML.
        where: What to call it in an error.

    Raises:
        DesignFileError: What the text says is wrong.
    """
    return _parse(text, text.encode(), where=where)


def _parse(text: str, content: bytes, *, where: str) -> Design:
    try:
        return build_design(convert(_tables(text)), text=text, content=content)
    except QuantityError as error:
        raise DesignFileError(
            error.what, where=error.where, expected=error.expected, hint=error.hint
        ).at(where) from error
    except DesignFileError as error:
        raise error.at(where) from error


def _content(path: str | Path) -> bytes:
    try:
        with Path(path).open("rb") as file:
            content = file.read(_LARGEST_BYTES + 1)
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) else str(error)
        raise DesignFileError(
            f"the design file cannot be read: {reason}",
            where=str(path),
            expected="a TOML file",
            hint="`benchlog new DIR` makes one to start from",
        ) from error
    if len(content) > _LARGEST_BYTES:
        raise DesignFileError(
            "the file is too large for a design",
            where=str(path),
            expected=f"at most {_LARGEST_BYTES} bytes",
        )
    return content


def _tables(text: str) -> dict[str, Any]:
    """Read TOML; some editors put a byte order mark in front, which TOML does not allow."""
    text = text.removeprefix("\ufeff")
    if not text.strip():
        raise DesignFileError(
            "the file is empty",
            expected="a design in TOML",
            hint="`benchlog new DIR` makes one to start from",
        )
    try:
        return tomllib.loads(text)
    except (ValueError, RecursionError) as error:
        reason = str(error) if isinstance(error, ValueError) else "nested too deeply"
        raise DesignFileError(
            f"the file is not TOML: {reason}",
            expected='keys and values such as name = "line preamp"',
        ) from error
