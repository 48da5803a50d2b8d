"""Stages in cascade: parts by name, factors, plateau, and misuse."""

import math
from dataclasses import replace

import numpy as np
import pytest

from benchlog.circuit.amplifier import Amplifier
from benchlog.circuit.chain import Chain
from benchlog.circuit.topologies import Divider, Follower, Inverting, NonInverting, Summing
from benchlog.errors import Misuse

MAIN = Amplifier(gbw_hz=3e6, open_loop_gain=2e5, second_pole_hz=9e6)
OUTPUT = Amplifier(gbw_hz=10e6, name="output")
PREAMP = NonInverting(feedback_ohm=47e3, ground_ohm=1e3, coupling_f=1e-6, bias_ohm=47e3)
BUFFER = Inverting(input_ohm=10e3, feedback_ohm=10e3)
FREQUENCY_HZ = np.logspace(1, 6, 11)


def two_stages() -> Chain:
    """Return a preamp and an output stage with amplifiers of their own."""
    return Chain(
        ((PREAMP, MAIN), (BUFFER, OUTPUT)),
        figure_amplifier="main",
        tolerances={"stage[1].feedback": 0.01, "amplifier.output.gbw": 0.2},
    )


def test_response_is_the_product_of_the_stages() -> None:
    """An amplifier's output is not loaded by what follows."""
    each = [Chain(((PREAMP, MAIN),)), Chain(((BUFFER, OUTPUT),))]
    product = each[0].response(FREQUENCY_HZ) * each[1].response(FREQUENCY_HZ)
    np.testing.assert_allclose(two_stages().response(FREQUENCY_HZ), product, rtol=1e-12)
    outputs = two_stages().at_each_output(FREQUENCY_HZ)
    np.testing.assert_allclose(outputs[0], each[0].response(FREQUENCY_HZ), rtol=1e-12)
    np.testing.assert_allclose(outputs[1], product, rtol=1e-12)


def test_a_divider_is_loaded_by_an_inverting_leg() -> None:
    """1k/1k before a 10k leg: 0.5 open, 10k/10.5k of it left."""
    divider = Divider(series_ohm=1e3, shunt_ohm=1e3)
    chain = Chain(((divider, None), (BUFFER, OUTPUT)))
    assert chain.plateau() == pytest.approx(0.5 * 10 / 10.5, rel=1e-12)


def test_parts_have_names_that_the_design_file_gives_them() -> None:
    """Resistors, capacitors, second poles, and the GBW of all amplifiers but the figure's."""
    parts = {part.name: part for part in two_stages().parts()}
    assert list(parts) == [
        "stage[1].feedback",
        "stage[1].ground",
        "stage[1].bias",
        "stage[1].coupling",
        "stage[2].input",
        "stage[2].feedback",
        "amplifier.main.second_pole",
        "amplifier.output.gbw",
    ]
    assert parts["stage[1].coupling"].unit == "F"
    assert parts["stage[1].feedback"].value == 47e3
    assert parts["stage[1].feedback"].u_rel == pytest.approx(0.01 / math.sqrt(3))
    assert parts["stage[2].input"].tolerance == 0.0


def test_legs_of_a_summing_stage_are_parts_counted_from_one() -> None:
    """Each leg can be off by itself."""
    stage = Summing(inputs_ohm=(22e3, 33e3), feedback_ohm=66e3, driven=2)
    chain = Chain(((stage, MAIN),))
    assert [part.name for part in chain.parts()][:2] == ["stage[1].inputs[1]", "stage[1].inputs[2]"]
    assert chain.plateau(factors={"stage[1].inputs[2]": 2.0}) == pytest.approx(1.0, rel=1e-4)


@pytest.mark.parametrize(
    ("name", "preamp", "main", "output"),
    [
        ("stage[1].feedback", replace(PREAMP, feedback_ohm=1.1 * 47e3), MAIN, OUTPUT),
        ("stage[1].ground", replace(PREAMP, ground_ohm=1.1e3), MAIN, OUTPUT),
        ("stage[1].bias", replace(PREAMP, bias_ohm=1.1 * 47e3), MAIN, OUTPUT),
        ("stage[1].coupling", replace(PREAMP, coupling_f=1.1e-6), MAIN, OUTPUT),
        ("amplifier.main.second_pole", PREAMP, replace(MAIN, second_pole_hz=9.9e6), OUTPUT),
        ("amplifier.output.gbw", PREAMP, MAIN, replace(OUTPUT, gbw_hz=11e6)),
    ],
)
def test_each_factor_is_a_part_of_another_value(
    name: str, preamp: NonInverting, main: Amplifier, output: Amplifier
) -> None:
    """A factor does what rebuilding the chain with that value does, and something at all."""
    changed = two_stages().response(FREQUENCY_HZ, factors={name: 1.1})
    rebuilt = Chain(((preamp, main), (BUFFER, output))).response(FREQUENCY_HZ)
    np.testing.assert_allclose(changed, rebuilt, rtol=1e-12)
    assert not np.allclose(changed, two_stages().response(FREQUENCY_HZ), rtol=1e-6)


def test_gbw_replaces_that_of_the_figure_only() -> None:
    """The output stage keeps its own amplifier."""
    faster = Chain(((PREAMP, Amplifier(gbw_hz=6e6, open_loop_gain=2e5, second_pole_hz=9e6)),))
    other = Chain(((BUFFER, OUTPUT),))
    expected = faster.response(FREQUENCY_HZ) * other.response(FREQUENCY_HZ)
    found = two_stages().response(FREQUENCY_HZ, gbw_hz=6e6)
    np.testing.assert_allclose(found, expected, rtol=1e-12)


def test_arrays_of_values_broadcast_against_frequencies() -> None:
    """One row for each value, the same as each value by itself."""
    chain = two_stages()
    gbw_hz, factors = np.array([[1e6], [3e6]]), np.array([[0.99], [1.01]])
    both = chain.response(
        FREQUENCY_HZ, gbw_hz=gbw_hz, factors={"stage[1].feedback": factors}, source_ohm=50.0
    )
    assert both.shape == (2, 11)
    for row in range(2):
        alone = chain.response(
            FREQUENCY_HZ,
            gbw_hz=gbw_hz[row, 0],
            factors={"stage[1].feedback": factors[row, 0]},
            source_ohm=50.0,
        )
        np.testing.assert_allclose(both[row], alone, rtol=1e-12)
    assert np.shape(chain.plateau(factors={"stage[1].feedback": factors})) == (2, 1)


def test_plateau_loses_what_finite_gain_costs() -> None:
    """48 / (1 + 48 / 2e5) in mid-band, where the coupling is short."""
    assert Chain(((PREAMP, MAIN),)).plateau() == pytest.approx(48 / (1 + 48 / 2e5), rel=1e-12)
    assert Chain(((PREAMP, MAIN),)).noise_gain == pytest.approx(48.0)


def test_noise_gain_is_that_of_the_figure_amplifier() -> None:
    """The largest where it is in several stages."""
    assert two_stages().noise_gain == pytest.approx(48.0)
    other = Chain(((PREAMP, MAIN), (BUFFER, OUTPUT)), figure_amplifier="output")
    assert other.noise_gain == pytest.approx(2.0)
    assert other.gbw_hz == 10e6
    same = Chain(((BUFFER, MAIN), (PREAMP, MAIN)))
    assert same.figure_stages == (1, 2)
    assert same.noise_gain == pytest.approx(48.0)


@pytest.mark.parametrize(
    ("stages", "name", "message"),
    [
        ((), None, "a chain needs a stage"),
        (((Follower(), None),), None, "every stage but a divider has an amplifier"),
        (
            ((Divider(series_ohm=1e3), MAIN),),
            None,
            "every stage but a divider has an amplifier",
        ),
        (
            ((Follower(), MAIN), (Follower(), Amplifier(gbw_hz=1e6))),
            None,
            "two different amplifiers are called 'main'",
        ),
        (((Follower(), MAIN),), "spare", "no amplifier is called 'spare'"),
    ],
    ids=["empty", "no amplifier", "amplifier in a divider", "one name twice", "unknown name"],
)
def test_a_chain_that_is_none_is_misuse(
    stages: tuple[tuple[Follower, Amplifier | None], ...], name: str | None, message: str
) -> None:
    """Programming errors are told apart from errors of a design file."""
    with pytest.raises(Misuse, match=message):
        Chain(stages, figure_amplifier=name)


def test_a_factor_that_names_no_part_is_misuse() -> None:
    """A misspelt part must not silently stay nominal."""
    with pytest.raises(Misuse, match=r"no part is called 'stage\[1\]\.feedbak'"):
        two_stages().response(FREQUENCY_HZ, factors={"stage[1].feedbak": 1.1})


def test_a_passive_chain_has_no_gbw() -> None:
    """Neither GBW nor noise gain, but a response."""
    chain = Chain(((Divider(series_ohm=1e3, shunt_ohm=1e3), None),))
    assert chain.plateau() == pytest.approx(0.5)
    assert chain.amplifiers() == ()
    with pytest.raises(Misuse, match="no GBW"):
        _ = chain.gbw_hz
    with pytest.raises(Misuse, match="no noise gain"):
        _ = chain.noise_gain
