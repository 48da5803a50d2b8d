"""Read a design file; whatever is wrong with it becomes one error that says where."""

from pathlib import Path

from benchlog.design.build import build_design
from benchlog.design.file import DesignFile
from benchlog.design.model import Design
from benchlog.errors import DesignFileError, QuantityError
from benchlog.tables import FileKind

KIND = FileKind(
    noun="design file",
    struct=DesignFile,
    error=DesignFileError,
    example='name = "line preamp"',
    hint="`benchlog new DIR` makes one to start from",
)


def read_design(path: str | Path) -> Design:
    """Read a design file.

    Args:
        path: A TOML file in UTF-8.

    Raises:
        DesignFileError: It cannot be read, or what it says is wrong: file, key path counted from
            1 (``stage[2].feedback``), what was expected.
    """
    content = KIND.content(path)
    return _parse(KIND.text(content, where=str(path)), content, where=str(path))


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
        return build_design(KIND.parse(text), text=text, content=content)
    except QuantityError as error:
        raise DesignFileError(
            error.what, where=error.where, expected=error.expected, hint=error.hint
        ).at(where) from error
    except DesignFileError as error:
        raise error.at(where) from error
