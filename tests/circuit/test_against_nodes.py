"""The closed-loop formulas against node equations that know none of them."""

import math
from typing import Literal

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchlog.circuit.amplifier import Amplifier
from benchlog.circuit.chain import Chain
from benchlog.circuit.stage import Stage
from benchlog.circuit.topologies import (
    Difference,
    Divider,
    Follower,
    Inverting,
    NonInverting,
    OpenLoop,
    Summing,
)
from benchlog.curve import ComplexArray
from benchlog.practice.wiring import StageKind, stage_output, wire_board

FREQUENCY_HZ = np.logspace(0, 7.5, 31)
NAMES: dict[type, str] = {
    Follower: "follower",
    NonInverting: "non-inverting",
    Inverting: "inverting",
    Summing: "summing",
    Difference: "difference",
    OpenLoop: "open-loop",
    Divider: "divider",
}

ohms = st.floats(min_value=2.0, max_value=6.0).map(lambda decade: 10**decade)
farads = st.floats(min_value=-12.0, max_value=-5.0).map(lambda decade: 10**decade)
some_farads = st.none() | farads
amplifiers = st.builds(
    Amplifier,
    gbw_hz=st.floats(min_value=5.0, max_value=8.0).map(lambda decade: 10**decade),
    open_loop_gain=st.just(math.inf) | st.floats(min_value=1e3, max_value=1e7),
    second_pole_hz=st.none() | st.floats(min_value=1e5, max_value=1e8),
)

followers = st.builds(
    Follower,
    feedback_ohm=ohms,
    feedback_capacitor_f=some_farads,
    input_capacitance_f=some_farads,
    bias_ohm=ohms,
    coupling_f=some_farads,
)
non_inverting = st.builds(
    NonInverting,
    feedback_ohm=ohms,
    ground_ohm=ohms,
    feedback_capacitor_f=some_farads,
    ground_capacitor_f=some_farads,
    input_capacitance_f=some_farads,
    bias_ohm=ohms,
    coupling_f=some_farads,
)
inverting = st.builds(
    Inverting,
    input_ohm=ohms,
    feedback_ohm=ohms,
    feedback_capacitor_f=some_farads,
    input_capacitance_f=some_farads,
    coupling_f=some_farads,
)
summing = st.builds(
    Summing,
    inputs_ohm=st.tuples(ohms, ohms, ohms),
    feedback_ohm=ohms,
    driven=st.integers(min_value=1, max_value=3),
    undriven=st.sampled_from(["grounded", "open"]),
    undriven_source_ohm=ohms,
    feedback_capacitor_f=some_farads,
    input_capacitance_f=some_farads,
    coupling_f=some_farads,
)


def difference(driven: Literal["plus", "minus", "both"]) -> st.SearchStrategy[Difference]:
    """Return difference stages with one input driven, or both."""
    return st.builds(
        Difference,
        input_ohm=ohms,
        feedback_ohm=ohms,
        plus_input_ohm=ohms,
        plus_ground_ohm=ohms,
        driven=st.just(driven),
        feedback_capacitor_f=some_farads,
        plus_ground_capacitor_f=some_farads,
        input_capacitance_f=some_farads,
    )


dividers = st.builds(Divider, series_ohm=ohms, shunt_ohm=ohms, capacitor_f=some_farads)


def by_nodes(chain: Chain, source_ohm: float) -> ComplexArray:
    """Return a chain's response out of node equations."""
    kinds = [
        StageKind(
            topology=NAMES[type(stage)],
            amplifier=None if amplifier is None else amplifier.name,
            legs=len(getattr(stage, "inputs_ohm", ())),
            driven=getattr(stage, "driven", 1),
            grounded=getattr(stage, "undriven", "grounded") == "grounded",
        )
        for stage, amplifier in chain.stages
    ]
    values = {part.name: part.value for part in chain.parts()}
    for amplifier in chain.amplifiers():
        values[f"amplifier.{amplifier.name}.gbw"] = float(amplifier.gbw_hz)
        values[f"amplifier.{amplifier.name}.open_loop_gain"] = amplifier.open_loop_gain
    solution = wire_board(kinds, values, source_ohm=source_ohm).solve(FREQUENCY_HZ)
    return solution.at(stage_output(len(kinds)))


def check(chain: Chain, source_ohm: float) -> None:
    """Hold the formulas to the node equations, in magnitude and phase."""
    formula = chain.response(FREQUENCY_HZ, source_ohm=source_ohm)
    nodes = by_nodes(chain, source_ohm)
    assert np.max(np.abs(formula / nodes - 1)) < 2e-6


@pytest.mark.parametrize(
    "stages",
    [
        pytest.param(followers, id="follower"),
        pytest.param(non_inverting, id="non-inverting"),
        pytest.param(inverting, id="inverting"),
        pytest.param(summing, id="summing"),
        pytest.param(difference("plus"), id="difference, plus"),
        pytest.param(difference("minus"), id="difference, minus"),
        pytest.param(st.just(OpenLoop()), id="open loop"),
    ],
)
def test_a_stage_behind_a_source(stages: st.SearchStrategy[Stage]) -> None:
    """Every topology, with any parts, from the open-circuit level of a source."""

    @settings(max_examples=25, deadline=None)
    @given(stage=stages, amplifier=amplifiers, source_ohm=st.just(1e-6) | ohms)
    def holds(stage: Stage, amplifier: Amplifier, source_ohm: float) -> None:
        check(Chain(((stage, amplifier),)), source_ohm)

    holds()


@settings(max_examples=25, deadline=None)
@given(stage=difference("both"), amplifier=amplifiers)
def test_both_inputs_of_a_difference_stage(stage: Difference, amplifier: Amplifier) -> None:
    """Half the drive on each input, in opposite phase, from a source without resistance."""
    check(Chain(((stage, amplifier),)), 1e-6)


@settings(max_examples=25, deadline=None)
@given(
    first=non_inverting,
    divider=dividers,
    second=inverting,
    amplifier=amplifiers,
    source_ohm=ohms,
)
def test_a_divider_between_two_stages(
    first: Stage, divider: Divider, second: Stage, amplifier: Amplifier, source_ohm: float
) -> None:
    """What follows a divider loads it; what follows an amplifier does not."""
    check(Chain(((first, amplifier), (divider, None), (second, amplifier))), source_ohm)
