"""Keeping the files that were imported, compressed, under the hash of their bytes."""

import gzip
import hashlib
import os
import shutil
from pathlib import Path

from benchlog.errors import CaptureError


def keep_original(file: Path, folder: Path) -> Path:
    """Copy a file, compressed, into a folder; a copy that is there already is left alone.

    The copy appears under its name only when it is whole.

    Returns:
        The copy: ``captures/<sha256><suffix>.gz``.

    Raises:
        CaptureError: It cannot be read or written.
    """
    try:
        with file.open("rb") as source:
            digest = hashlib.file_digest(source, "sha256").hexdigest()
            kept = folder / f"{digest}{file.suffix.lower()}.gz"
            if kept.exists():
                return kept
            folder.mkdir(parents=True, exist_ok=True)
            source.seek(0)
            unfinished = kept.with_suffix(f".{os.getpid()}.part")
            with gzip.open(unfinished, "wb", compresslevel=6) as target:
                shutil.copyfileobj(source, target, 1 << 20)
            unfinished.replace(kept)
    except OSError as error:
        raise CaptureError(
            f"the original cannot be kept: {error.strerror}",
            where=str(file),
            hint="--no-original imports without keeping it",
        ) from error
    return kept


def read_original(kept: Path) -> bytes:
    """Return the bytes of a kept original."""
    with gzip.open(kept, "rb") as file:
        return file.read()
