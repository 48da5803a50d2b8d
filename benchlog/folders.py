"""Find the data folders ``drivers`` and ``schema``, in a wheel or in a checkout."""

from importlib.resources import files
from importlib.resources.abc import Traversable


def data_folder(name: str) -> Traversable:
    """Return the folder that ships beside the package.

    Args:
        name: ``"drivers"`` or ``"schema"``.

    Returns:
        The folder; read it with ``iterdir()`` and ``read_text()``, picking files by suffix.

    Raises:
        FileNotFoundError: The folder is neither in the package nor beside it.
    """
    package = files("benchlog")
    inside = package / name
    if inside.is_dir():
        return inside
    checkout = package / ".."
    if (checkout / "pyproject.toml").is_file() and (checkout / name).is_dir():
        return checkout / name
    raise FileNotFoundError(f"data folder {name!r} is neither in {package} nor beside it")
