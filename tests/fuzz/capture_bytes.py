"""Throw bytes at the capture reader, guided by coverage, for a bounded time.

Needs the package atheris, which the tests do not.  Any exception but ``CaptureError`` ends it and
leaves the bytes in a ``crash-*`` file.

    python tests/fuzz/capture_bytes.py -max_total_time=60 -timeout=5
"""

import sys
import tempfile
from pathlib import Path

import atheris

with atheris.instrument_imports(include=["benchlog.capture"]):
    from benchlog.capture.read import inspect_captures
    from benchlog.errors import CaptureError

_FILE = Path(tempfile.mkdtemp()) / "capture.csv"


def one_input(data: bytes) -> None:
    """Read one file; an honest refusal is as good as a curve."""
    _FILE.write_bytes(data)
    try:
        inspect_captures([_FILE])
    except CaptureError:
        return


if __name__ == "__main__":
    atheris.Setup(sys.argv, one_input)
    atheris.Fuzz()
