"""Write schema/*.schema.json anew from the shapes that the program reads files with.

Run it after a change of such a shape: ``python tests/regenerate_schemas.py``.
"""

import json
from pathlib import Path
from typing import Any

import msgspec

from benchlog.bench.driver_file import DriverFile
from benchlog.bench.setup_file import BenchTables
from benchlog.design.file import DesignFile

SCHEMA_FOLDER = Path(__file__).parents[1] / "schema"

SHAPES: dict[str, tuple[type, str]] = {
    "bench.schema.json": (BenchTables, "A benchlog bench file (TOML)"),
    "design.schema.json": (DesignFile, "A benchlog design file (TOML)"),
    "driver.schema.json": (DriverFile, "A benchlog driver file (TOML)"),
}


def schema_text(name: str) -> str:
    """Return what a schema file must hold."""
    shape, title = SHAPES[name]
    head: dict[str, Any] = {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": title,
    }
    return json.dumps({**head, **msgspec.json.schema(shape)}, indent=2, ensure_ascii=False) + "\n"


if __name__ == "__main__":
    for file_name in SHAPES:
        (SCHEMA_FOLDER / file_name).write_text(schema_text(file_name), encoding="utf-8")
