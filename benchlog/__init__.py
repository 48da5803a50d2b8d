"""Sweep amplifier boards, keep every point, judge each board against its design.

The public names below are imported on first use, so that importing the package stays cheap.
"""

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from benchlog.capture.read import read_capture as read_capture
    from benchlog.curve import GainCurve as GainCurve
    from benchlog.design.read import read_design as read_design
    from benchlog.extract.figures import extract as extract
    from benchlog.extract.many import extract_many as extract_many
    from benchlog.judge.verdict import judge as judge
    from benchlog.logbook.store import Logbook as Logbook

__version__ = "0.1.0"

_HOME = {
    "GainCurve": "benchlog.curve",
    "Logbook": "benchlog.logbook.store",
    "extract": "benchlog.extract.figures",
    "extract_many": "benchlog.extract.many",
    "judge": "benchlog.judge.verdict",
    "read_capture": "benchlog.capture.read",
    "read_design": "benchlog.design.read",
}

__all__ = [
    "GainCurve",
    "Logbook",
    "__version__",
    "extract",
    "extract_many",
    "judge",
    "read_capture",
    "read_design",
]


def __getattr__(name: str) -> object:
    """Import a public name from its room when it is first asked for."""
    if name not in _HOME:
        raise AttributeError(f"module 'benchlog' has no attribute {name!r}")
    value: object = getattr(import_module(_HOME[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    """List the public names, imported or not."""
    return __all__
