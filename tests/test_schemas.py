"""The shipped JSON schemas are those of the shapes that the program reads files with."""

import pytest

from tests.regenerate_schemas import SCHEMA_FOLDER, SHAPES, schema_text


@pytest.mark.parametrize("name", SHAPES)
def test_a_shipped_schema_is_the_programs_own(name: str) -> None:
    """An editor that checks a file by its schema must agree with the program."""
    shipped = (SCHEMA_FOLDER / name).read_text(encoding="utf-8")
    assert shipped == schema_text(name), "run: python tests/regenerate_schemas.py"


def test_no_schema_is_left_behind() -> None:
    """Every shipped schema has a shape."""
    assert {path.name for path in SCHEMA_FOLDER.glob("*.schema.json")} == set(SHAPES)
