"""The data folders are found from a checkout."""

import pytest

from benchlog.folders import data_folder


@pytest.mark.parametrize("name", ["drivers", "schema"])
def test_shipped_folders_are_found(name: str) -> None:
    """Both folders hold files that the program needs."""
    assert any(entry.is_file() for entry in data_folder(name).iterdir())


def test_unknown_folder_is_named_in_the_error() -> None:
    """The message says where it was looked for."""
    with pytest.raises(FileNotFoundError, match="'recipes' is neither in"):
        data_folder("recipes")
