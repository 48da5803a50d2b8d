"""A design's parts become a board's, and the board agrees with the design's own formulas.

The board solves node equations and the design multiplies gains: two routes to one response.
"""

import math

import numpy as np
import pytest

from benchlog.curve import FloatArray
from benchlog.design.example import EXAMPLE_DESIGN
from benchlog.design.model import Design
from benchlog.design.read import parse_design
from benchlog.practice.board import PracticeBoard
from benchlog.practice.parts import PartsList, parts_list
from benchlog.practice.wiring import StageKind

FREQUENCY_HZ: FloatArray = np.geomspace(1.0, 3e7, 61)


def design(stages: str, *, amplifier: str = 'gbw = "3 MHz"', tail: str = "") -> Design:
    """Return a design of some stages around one amplifier."""
    return parse_design(
        f"""
        name = "a test"
        revision = "1"
        {stages}
        [amplifier.main]
        {amplifier}
        {tail}
        [budget]
        gain = {{ min = "1 dB" }}
        """,
        where="a test",
    )


STAGES = {
    "follower": 'topology = "follower"\nfeedback = "10k"\ninput_capacitance = "10p"',
    "non-inverting": (
        'topology = "non-inverting"\nfeedback = "47k"\nground = "1k"\nfeedback_capacitor = "22p"\n'
        'ground_capacitor = "10u"\ninput_capacitance = "5p"\nbias = "47k"\ncoupling = "1u"'
    ),
    "inverting": (
        'topology = "inverting"\ninput = "10k"\nfeedback = "47k"\nfeedback_capacitor = "22p"\n'
        'coupling = "1u"\ninput_capacitance = "5p"'
    ),
    "summing": (
        'topology = "summing"\ninputs = ["22k", "33k", "10k"]\ndriven = 2\nfeedback = "47k"\n'
        'undriven_source = "600"\ncoupling = "1u"'
    ),
    "open legs": (
        'topology = "summing"\ninputs = ["22k", "33k"]\nfeedback = "47k"\nundriven = "open"'
    ),
    "difference, plus": (
        'topology = "difference"\ninput = "1k"\nfeedback = "10k"\nplus_input = "1k"\n'
        'plus_ground = "9k1"\ndriven = "plus"\nplus_ground_capacitor = "47p"'
    ),
    "difference, minus": (
        'topology = "difference"\ninput = "1k"\nfeedback = "10k"\nplus_input = "1k"\n'
        'plus_ground = "10k"\ndriven = "minus"'
    ),
    "difference, both": (
        'topology = "difference"\ninput = "1k"\nfeedback = "10k"\nplus_input = "2k"\n'
        'plus_ground = "10k"'
    ),
}
AMPLIFIER = 'gbw = "3 MHz"\nopen_loop_gain = "100 dB"\nsecond_pole = "9 MHz"'


def placed(name: str) -> str:
    """Return one stage as text."""
    return f'[[stage]]\n{STAGES[name]}\namplifier = "main"'


@pytest.mark.parametrize("name", STAGES)
def test_board_agrees_with_its_design(name: str) -> None:
    """Both routes give the same response, magnitude and phase, to nine digits."""
    made = design(placed(name), amplifier=AMPLIFIER)
    board = PracticeBoard(made, spread=False)
    expected = made.chain().response(FREQUENCY_HZ)
    np.testing.assert_allclose(board.gain(FREQUENCY_HZ), expected, rtol=1e-9)


def test_chain_with_a_passive_stage_agrees_with_its_design() -> None:
    """A divider is loaded by what follows it, in both routes."""
    divider = '[[stage]]\ntopology = "divider"\nseries = "1k"\nshunt = "2k2"\ncapacitor = "1n"'
    made = design("\n".join((placed("non-inverting"), divider, placed("inverting"))))
    board = PracticeBoard(made, spread=False)
    expected = made.chain().response(FREQUENCY_HZ)
    np.testing.assert_allclose(board.gain(FREQUENCY_HZ), expected, rtol=1e-9)
    assert board.levels(1e3, 0.1, source_ohm=50).noise_vrms > 0


def test_low_pass_without_a_shunt_agrees_with_its_design() -> None:
    """A divider may be a capacitor alone."""
    divider = '[[stage]]\ntopology = "divider"\nseries = "1k"\ncapacitor = "1n"'
    made = design("\n".join((divider, placed("inverting"))))
    expected = made.chain().response(FREQUENCY_HZ)
    np.testing.assert_allclose(
        PracticeBoard(made, spread=False).gain(FREQUENCY_HZ), expected, rtol=1e-9
    )


def test_active_stage_without_an_amplifier_is_refused() -> None:
    """A parts list made by hand can be wrong."""
    kind = StageKind(topology="follower", amplifier=None)
    with pytest.raises(ValueError, match="stage 1 has no amplifier"):
        PracticeBoard(PartsList(kinds=(kind,), parts={})).gain(FREQUENCY_HZ)


def test_open_loop_agrees_with_its_design() -> None:
    """The amplifier alone."""
    made = design('[[stage]]\ntopology = "open-loop"\namplifier = "main"', amplifier=AMPLIFIER)
    board = PracticeBoard(made, spread=False)
    expected = made.chain().response(FREQUENCY_HZ)
    np.testing.assert_allclose(board.gain(FREQUENCY_HZ), expected, rtol=1e-9)


@pytest.mark.parametrize("name", STAGES)
def test_source_resistance_agrees_with_the_design(name: str) -> None:
    """Counted from the open-circuit level, the source's 50 ohm are part of the circuit."""
    made = design(placed(name))
    board = PracticeBoard(made, spread=False)
    expected = np.abs(made.chain().response(FREQUENCY_HZ, source_ohm=50.0))
    measured = [
        board.levels(float(frequency_hz), 1e-3, source_ohm=50.0).output_vrms / 1e-3
        for frequency_hz in FREQUENCY_HZ
    ]
    if name == "difference, both":
        # The bench balances with a transformer behind its 50 ohm, which then carry no current.
        expected = np.abs(made.chain().response(FREQUENCY_HZ))
    np.testing.assert_allclose(measured, expected, rtol=1e-8)


def test_example_design_spreads_as_it_says() -> None:
    """Resistors within 1 %, GBW between least and most; limits of the amplifier are exact."""
    parts = parts_list(parse_design(EXAMPLE_DESIGN, where="example")).parts
    assert sorted(parts) == [
        "amplifier.main.gbw",
        "amplifier.main.open_loop_gain",
        "amplifier.main.output_swing",
        "amplifier.main.output_swing_negative",
        "amplifier.main.slew_rate",
        "stage[1].feedback",
        "stage[1].ground",
    ]
    feedback, gbw = parts["stage[1].feedback"], parts["amplifier.main.gbw"]
    assert (feedback.lowest, feedback.nominal, feedback.highest) == pytest.approx(
        (46.53e3, 47e3, 47.47e3)
    )
    assert (gbw.lowest, gbw.nominal, gbw.highest) == pytest.approx((2e6, 3e6, 4e6))
    values = PracticeBoard(parse_design(EXAMPLE_DESIGN, where="example"), seed=1).values
    assert values["amplifier.main.slew_rate"] == 13e6
    assert values["stage[1].feedback"] != 47e3


@pytest.mark.parametrize(
    ("gbw", "lowest_hz", "highest_hz"),
    [
        ('"3 MHz"', 2.4e6, 3.6e6),
        ('{ min = "2 MHz", typical = "3 MHz" }', 2e6, 4e6),
        ('{ typical = "3 MHz", max = "3.5 MHz" }', 2.5e6, 3.5e6),
        ('{ min = "2 MHz", typical = "3 MHz", max = "5 MHz" }', 2e6, 5e6),
    ],
)
def test_band_of_the_gbw(gbw: str, lowest_hz: float, highest_hz: float) -> None:
    """Where one end is not known it lies as far off as the other; with none, a fifth."""
    made = design(placed("inverting"), amplifier=f"gbw = {gbw}")
    part = parts_list(made).parts["amplifier.main.gbw"]
    assert (part.lowest, part.highest) == pytest.approx((lowest_hz, highest_hz))


def test_infinite_open_loop_gain_stays_infinite() -> None:
    """A part without a band is what it is."""
    board = PracticeBoard(design(placed("inverting")), seed=3)
    assert board.values["amplifier.main.open_loop_gain"] == math.inf


def test_tolerances_of_the_design_are_used() -> None:
    """One for all capacitors, and one of a single part."""
    stage = placed("inverting").replace('"10k"', '{ value = "10k", tolerance = "0.1%" }')
    made = design(stage, tail='[tolerance]\ncapacitor = "20%"')
    parts = parts_list(made).parts
    assert parts["stage[1].input"].highest == pytest.approx(10.01e3)
    assert parts["stage[1].coupling"].lowest == pytest.approx(0.8e-6)
