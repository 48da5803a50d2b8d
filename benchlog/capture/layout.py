"""Saved layouts: what a person said about files of one shape, kept by name for the next time."""

import json
import re
from pathlib import Path

import msgspec

from benchlog.capture.read import Told
from benchlog.errors import CaptureError
from benchlog.tables import FileKind

_NAME = re.compile(r"[A-Za-z0-9][A-Za-z0-9_.-]{0,63}")


class LayoutFile(msgspec.Struct, forbid_unknown_fields=True, frozen=True, kw_only=True):
    """A layout file: units and columns as ``import`` takes them."""

    units: dict[str, str] = {}
    columns: dict[str, str] = {}


KIND = FileKind(
    noun="layout file",
    struct=LayoutFile,
    error=CaptureError,
    example='units = { gain = "dB" }',
    hint="`benchlog import ... --save-layout NAME` makes one",
)


def read_layout(folder: Path, name: str) -> Told:
    """Read a layout of a bench folder.

    Raises:
        CaptureError: There is none of this name, or its file is wrong.
    """
    path = _path(folder, name)
    content = KIND.content(path)
    try:
        file = KIND.parse(KIND.text(content, where=str(path)))
    except CaptureError as error:
        raise error.at(str(path)) from error
    return Told(units=file.units, columns=file.columns)


def save_layout(folder: Path, name: str, told: Told) -> Path:
    """Write a layout into a bench folder; one of the same name is replaced.

    Raises:
        CaptureError: The name is no name for a file, or the file cannot be written.
    """
    path = _path(folder, name)
    lines = ["# What `benchlog import` was told about files of this shape."]
    for key, table in (("units", told.units), ("columns", told.columns)):
        inner = ", ".join(f"{json.dumps(k)} = {json.dumps(v)}" for k, v in table.items())
        lines.append(f"{key} = {{ {inner} }}" if inner else f"{key} = {{}}")
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text("\n".join([*lines, ""]), encoding="utf-8")
    except OSError as error:
        raise CaptureError(
            f"the layout cannot be written: {error.strerror}", where=str(path)
        ) from error
    return path


def _path(folder: Path, name: str) -> Path:
    if not _NAME.fullmatch(name):
        raise CaptureError(
            f"{name!r} is no name for a layout",
            where="layout",
            expected="letters, digits, dot, dash and underscore",
        )
    return folder / "layouts" / f"{name}.toml"
