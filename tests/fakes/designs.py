"""Invented designs made without a design file."""

from benchlog.circuit.amplifier import Amplifier
from benchlog.circuit.topologies import NonInverting
from benchlog.design.model import Budget, Design, PlacedStage


def one_stage(**changes: object) -> Design:
    """Return a design of one non-inverting stage, 47k over 1k, GBW 3 MHz: gain 48, corner 62.5 kHz.

    Args:
        changes: Fields of the design to replace.
    """
    fields: dict[str, object] = {
        "name": "line preamp",
        "revision": "C",
        "text": "",
        "sha256": "0" * 64,
        "stages": (
            PlacedStage(
                topology="non-inverting",
                stage=NonInverting(feedback_ohm=47e3, ground_ohm=1e3),
                amplifier="main",
            ),
        ),
        "amplifiers": (Amplifier(gbw_hz=3e6, slew_rate_v_per_s=13e6, output_swing_v=10.5),),
        "figure_amplifier": "main",
        "tolerances": {},
        "budget": Budget(rule="simple", guard=1.0, lines=()),
        "rails_v": (-12.0, 12.0),
        "drive_level_vrms": 0.02 / 2**1.5,
    }
    return Design(**{**fields, **changes})  # type: ignore[arg-type]
