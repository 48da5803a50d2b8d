"""A board's node equations against closed forms worked here, and its limits and noise.

The closed form of a one-pole loop is ``H = ideal / (1 + NG/A)``, with noise gain NG and
``1/A = 1/A0 + j f/GBW`` (textbook; DESIGN of this project, physics).
"""

import math
from dataclasses import replace
from typing import Any, TypeAlias

import numpy as np
import numpy.typing as npt
import pytest

from benchlog.curve import ComplexArray, FloatArray
from benchlog.practice.board import NOISE_V_PER_ROOT_HZ, PracticeBoard
from benchlog.practice.parts import Part, PartsList
from tests.fakes.practice_boards import PREAMP, corner_hz, parts_list

Impedance: TypeAlias = npt.NDArray[np.complexfloating[Any, Any]]

FREQUENCY_HZ: FloatArray = np.geomspace(1.0, 1e7, 71)


def nominal(parts: PartsList) -> PracticeBoard:
    """Return a board with nominal parts."""
    return PracticeBoard(parts, spread=False)


def loop(ideal: complex | Impedance, noise_gain: complex | Impedance) -> ComplexArray:
    """Return the closed form for a GBW of 1 MHz."""
    return np.asarray(ideal / (1 + noise_gain * 1j * FREQUENCY_HZ / 1e6), np.complex128)


# Impedance of 10 kohm with 100 pF beside it, and of 1 kohm behind 1 uF.
FEEDBACK = 1e4 / (1 + 2j * np.pi * FREQUENCY_HZ * 1e4 * 1e-10)
COUPLED = 1e3 + 1 / (2j * np.pi * FREQUENCY_HZ * 1e-6)
LEAK = 2j * np.pi * FREQUENCY_HZ * 1e4 * 1e-11
# A divider of two 1 kohm with 1 nF, and 1 kohm behind it.
SHUNT = 1e3 / (1 + 2j * np.pi * FREQUENCY_HZ * 1e3 * 1e-9)
LEG = 1e3 + 1 / (1e-3 + 1 / SHUNT)
HIGH_PASS = 1 / (1 + 1 / (2j * np.pi * FREQUENCY_HZ * 47e3 * 1e-6))

CLOSED_FORMS = {
    "follower": (parts_list(("follower", {})), loop(1, 1)),
    "non-inverting": (
        parts_list(("non-inverting", {"feedback": 9e3, "ground": 1e3})),
        loop(10, 10),
    ),
    "inverting": (parts_list(("inverting", {"feedback": 1e4, "input": 1e3})), loop(-10, 11)),
    "feedback capacitor": (
        parts_list(("inverting", {"feedback": 1e4, "input": 1e3, "feedback_capacitor": 1e-10})),
        loop(-FEEDBACK / 1e3, 1 + FEEDBACK / 1e3),
    ),
    "non-inverting with capacitor": (
        parts_list(
            ("non-inverting", {"feedback": 1e4, "ground": 1e3, "feedback_capacitor": 1e-10})
        ),
        loop(1 + FEEDBACK / 1e3, 1 + FEEDBACK / 1e3),
    ),
    "coupled inverting": (
        parts_list(("inverting", {"feedback": 1e4, "input": 1e3, "coupling": 1e-6})),
        loop(-1e4 / COUPLED, 1 + 1e4 / COUPLED),
    ),
    "coupled non-inverting": (
        parts_list(
            (
                "non-inverting",
                {"feedback": 9e3, "ground": 1e3, "coupling": 1e-6, "bias": 47e3},
            )
        ),
        loop(10, 10) * HIGH_PASS,
    ),
    "capacitor in the ground leg": (
        parts_list(("non-inverting", {"feedback": 1e4, "ground": 1e3, "ground_capacitor": 1e-6})),
        loop(1 + 1e4 / COUPLED, 1 + 1e4 / COUPLED),
    ),
    "open loop": (parts_list(("open-loop", {})), 1e6 / (1j * FREQUENCY_HZ)),
    "follower through a resistor": (
        parts_list(("follower", {"feedback": 1e4, "input_capacitance": 1e-11})),
        loop(1 + LEAK, 1 + LEAK),
    ),
    "input capacitance": (
        parts_list(("inverting", {"feedback": 1e4, "input": 1e3, "input_capacitance": 1e-11})),
        loop(-10, 11 + LEAK),
    ),
    "loaded divider": (
        parts_list(
            ("divider", {"series": 1e3, "shunt": 1e3, "capacitor": 1e-9}),
            ("inverting", {"feedback": 1e4, "input": 1e3}),
        ),
        loop(-1e4 / LEG, 1 + 1e4 / LEG) * SHUNT / (SHUNT + 1e3),
    ),
    "two stages": (
        parts_list(
            ("non-inverting", {"feedback": 9e3, "ground": 1e3}),
            ("inverting", {"feedback": 1e4, "input": 1e3}),
        ),
        loop(10, 10) * loop(-10, 11),
    ),
}


@pytest.mark.parametrize("name", CLOSED_FORMS)
def test_gain_meets_the_closed_form(name: str) -> None:
    """Magnitude and phase over seven decades, from the board's input."""
    parts, expected = CLOSED_FORMS[name]
    np.testing.assert_allclose(nominal(parts).gain(FREQUENCY_HZ), expected, rtol=1e-9)


def summing(*, driven: int, grounded: bool) -> PartsList:
    """Return a summing stage with legs of 1, 2 and 5 kohm."""
    parts = parts_list(
        (
            "summing",
            {"feedback": 1e4, "inputs[1]": 1e3, "inputs[2]": 2e3, "inputs[3]": 5e3},
        )
    )
    (kind,) = parts.kinds
    return replace(parts, kinds=(replace(kind, legs=3, driven=driven, grounded=grounded),))


@pytest.mark.parametrize(
    ("driven", "grounded", "ideal", "noise_gain"),
    [(1, True, -10, 18), (2, True, -5, 18), (3, True, -2, 18), (1, False, -10, 11)],
)
def test_summing_stage(driven: int, ideal: float, noise_gain: float, *, grounded: bool) -> None:
    """Grounded legs add to the noise gain, open ones do not: 1 + 10 (1/1 + 1/2 + 1/5) = 18."""
    board = nominal(summing(driven=driven, grounded=grounded))
    np.testing.assert_allclose(board.gain(FREQUENCY_HZ), loop(ideal, noise_gain), rtol=1e-9)


@pytest.mark.parametrize(("driven", "ideal"), [("plus", 10.0), ("minus", -10.0), ("both", 10.0)])
def test_difference_stage(driven: str, ideal: float) -> None:
    """With matched dividers all ways to drive it have the same gain; the noise gain is 11."""
    parts = parts_list(
        (
            "difference",
            {"feedback": 1e4, "input": 1e3, "plus_input": 1e3, "plus_ground": 1e4},
        )
    )
    parts = replace(parts, kinds=(replace(parts.kinds[0], driven=driven),))
    np.testing.assert_allclose(nominal(parts).gain(FREQUENCY_HZ), loop(ideal, 11), rtol=1e-9)


@pytest.mark.parametrize(
    ("source_ohm", "reference", "expected_hz"),
    [(50.0, "input", 272.73e3), (50.0, "open circuit", 285.07e3)],
)
def test_source_resistance_counts_from_the_open_circuit_only(
    source_ohm: float, reference: str, expected_hz: float
) -> None:
    """Rs 50, Ri 1k, Rf 10k, GBW 3 MHz: worked figures of the project's physics review."""
    board = nominal(
        parts_list(("inverting", {"feedback": 1e4, "input": 1e3}), amplifier={"gbw": 3e6})
    )

    def gain(frequency_hz: float) -> float:
        levels = board.levels(frequency_hz, 1e-3, source_ohm=source_ohm)
        return levels.output_vrms / (levels.input_vrms if reference == "input" else 1e-3)

    low, high = 1e3, 1e7
    plateau = gain(1.0)
    for _ in range(50):
        middle = math.sqrt(low * high)
        low, high = (middle, high) if gain(middle) > plateau / math.sqrt(2) else (low, middle)
    assert low == pytest.approx(expected_hz, rel=2e-5)


@pytest.mark.parametrize(
    ("ideal", "gain", "bandwidth_hz"),
    [
        (1.0, 0.999995, 1_000_005),
        (10.0, 9.9995, 100_005),
        (100.0, 99.950025, 10_005),
        (1000.0, 995.024876, 1_005),
        (10_000.0, 9523.8095, 105),
    ],
)
def test_finite_open_loop_gain(ideal: float, gain: float, bandwidth_hz: float) -> None:
    """A0 = 2e5 and GBW 1 MHz: exact DC gain and bandwidth as recomputed for the checks (own)."""
    amplifier = {"gbw": 1e6, "open_loop_gain": 2e5}
    stage = ("non-inverting", {"feedback": (ideal - 1) * 1e3, "ground": 1e3})
    if ideal == 1.0:
        stage = ("follower", {})
    board = nominal(parts_list(stage, amplifier=amplifier))
    assert abs(board.gain(np.array([1e-3]))[0]) == pytest.approx(gain, rel=1e-7)
    assert corner_hz(board) == pytest.approx(bandwidth_hz, rel=1e-5)


def test_second_pole_gives_peaking() -> None:
    """Second pole at the loop's crossover: phase margin 45 degrees there means f2 = fc = 1/sqrt(2).

    Of the exact two-pole table: phase margin 45 degrees has f2/fc = 1, a gain of 1.3066 at the
    crossover, 2.350 dB of peak and a corner at 1.6119 fc.  The crossover of
    ``GBW / f / sqrt(1 + (f/f2)^2) = 1`` with f2 = f is at GBW / sqrt(2).
    """
    crossover_hz = 1e6 / math.sqrt(2)
    board = nominal(
        parts_list(("follower", {}), amplifier={"gbw": 1e6, "second_pole": crossover_hz})
    )
    frequency_hz = np.geomspace(1e5, 3e6, 20_001)
    gain = np.abs(board.gain(frequency_hz))
    assert 20 * math.log10(gain.max()) == pytest.approx(2.350, abs=1e-3)
    at_crossover = board.gain(np.array([crossover_hz]))[0]
    assert abs(at_crossover) == pytest.approx(1.3066, abs=1e-4)
    last = frequency_hz[np.flatnonzero(gain > 1 / math.sqrt(2))[-1]]
    assert last / crossover_hz == pytest.approx(1.6119, rel=3e-4)


def test_clipping_and_slewing_limit_the_output() -> None:
    """10.5 V peak of swing; 13 V/us at 1 MHz is 2.07 V peak."""
    board = nominal(PREAMP)
    assert board.levels(1e3, 1e3, source_ohm=50).output_vrms == pytest.approx(10.5, rel=1e-3)
    slewing = board.levels(1e6, 7.0, source_ohm=50).output_vrms
    assert slewing == pytest.approx(13e6 / 4e6 / math.sqrt(3), rel=0.05)
    small = board.levels(1e6, 7e-3, source_ohm=50).output_vrms
    assert small == pytest.approx(7e-3 * abs(board.gain(np.array([1e6]))[0]), rel=1e-12)


def test_what_the_first_stage_clips_the_second_does_not_get() -> None:
    """A first stage held to 1 V peak leaves the second, of gain -1, with no more than that."""
    parts = parts_list(
        ("non-inverting", {"feedback": 9e3, "ground": 1e3}),
        ("inverting", {"feedback": 1e3, "input": 1e3}),
        amplifier={"gbw": 1e8, "output_swing": 1.0},
    )
    levels = nominal(parts).levels(100.0, 0.1 / math.sqrt(2), source_ohm=50)
    assert levels.output_vrms == pytest.approx(math.sqrt(0.5), rel=1e-3)
    levels = nominal(parts).levels(100.0, 10.0, source_ohm=50)
    assert 0.8 < levels.output_vrms <= 1.0


def test_what_a_stage_loses_is_lost_to_all_that_follow() -> None:
    """Two stages of -1/2 behind a clipped one leave a quarter of what was clipped."""
    first = ("non-inverting", {"feedback": 9e3, "ground": 1e3})
    half = ("inverting", {"feedback": 5e3, "input": 1e4})
    amplifier = {"gbw": 1e8, "output_swing": 1.0}
    alone = nominal(parts_list(first, amplifier=amplifier))
    chain = nominal(parts_list(first, half, half, amplifier=amplifier))
    clipped = alone.levels(100.0, 1.0, source_ohm=50).output_vrms
    assert 0.9 < clipped < 1.0
    quarter = chain.levels(100.0, 1.0, source_ohm=50).output_vrms
    assert quarter == pytest.approx(clipped / 4, rel=1e-4)


def test_noise_is_the_density_over_the_noise_bandwidth() -> None:
    """One pole: e_n x NG x sqrt(pi/2 fc), with what lies beyond 10 MHz cut off."""
    board = nominal(parts_list(("non-inverting", {"feedback": 99e3, "ground": 1e3})))
    expected = NOISE_V_PER_ROOT_HZ * 100 * math.sqrt(math.pi / 2 * 1e4)
    assert board.noise_vrms() == pytest.approx(expected, rel=2e-3)
    assert board.levels(1e3, 0.0, source_ohm=50.0).noise_vrms == pytest.approx(expected, rel=2e-3)


def test_no_drive_no_output() -> None:
    """Silence in, silence out."""
    levels = nominal(PREAMP).levels(1e3, 0.0, source_ohm=0.0)
    assert (levels.input_vrms, levels.output_vrms) == (0.0, 0.0)


class TestSpread:
    """Parts are drawn inside their tolerance, by the seed."""

    def test_same_seed_same_board(self) -> None:
        """A board can be built again."""
        assert PracticeBoard(PREAMP, seed=5).values == PracticeBoard(PREAMP, seed=5).values
        assert PracticeBoard(PREAMP, seed=5).values != PracticeBoard(PREAMP, seed=6).values

    def test_parts_fill_their_tolerance_and_never_leave_it(self) -> None:
        """Evenly likely: mean nominal, standard deviation a/sqrt(3); four standard errors."""
        drawn = np.array(
            [PracticeBoard(PREAMP, seed=seed).values["stage[1].feedback"] for seed in range(1000)]
        )
        off = (drawn / 47e3 - 1) / 0.01
        assert np.max(np.abs(off)) <= 1.0
        assert abs(off.mean()) < 4 / math.sqrt(3000)
        assert off.std() == pytest.approx(1 / math.sqrt(3), rel=0.06)

    def test_parts_are_drawn_on_their_own(self) -> None:
        """Two parts of one board say nothing of each other."""
        boards = [PracticeBoard(PREAMP, seed=seed).values for seed in range(500)]
        pair = np.array([[b["stage[1].feedback"], b["stage[1].ground"]] for b in boards])
        assert abs(np.corrcoef(pair.T)[0, 1]) < 4 / math.sqrt(500)

    def test_uneven_band(self) -> None:
        """A GBW of 2 to 4 MHz around 2.5 stays inside, nominal at chance zero."""
        part = Part(nominal=2.5e6, lowest=2e6, highest=4e6)
        assert [part.drawn(chance) for chance in (-1, 0, 1)] == [2e6, 2.5e6, 4e6]

    def test_changes_replace_parts(self) -> None:
        """A wrong part is what it is, tolerance or not; the others stay."""
        good = PracticeBoard(PREAMP, seed=5)
        changes = {"stage[1].ground": 1.1e3, "amplifier.main.gbw": 1.4e6}
        wrong = PracticeBoard(PREAMP, seed=5, changes=changes)
        assert wrong.values == {**good.values, **changes}

    def test_unknown_change_is_refused(self) -> None:
        """The message lists what there is."""
        with pytest.raises(ValueError, match=r"no part 'stage\[2\].ground'; there are: stage\[1"):
            PracticeBoard(PREAMP, changes={"stage[2].ground": 1.0})

    def test_labels(self) -> None:
        """A board has a name even if nobody gave it one."""
        assert PracticeBoard(PREAMP, seed=5).label == "board 5"
        assert PracticeBoard(PREAMP, seed=5, label="0042").label == "0042"
