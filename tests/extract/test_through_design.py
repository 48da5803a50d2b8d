"""GBW where other parts than the amplifier shape the curve: a number, a bound, or neither."""

import math

import numpy as np
import pytest

from benchlog.circuit.nominal import nominal_figures
from benchlog.curve import FloatArray, GainCurve
from benchlog.design.model import Design
from benchlog.design.read import parse_design
from benchlog.errors import Misuse
from benchlog.extract.figures import extract
from benchlog.extract.many import extract_many
from benchlog.extract.models.designed import Designed
from benchlog.extract.validity import Fault
from benchlog.judge.verdict import judge
from benchlog.records import Term

WIDE: FloatArray = np.logspace(2, 7, 51)
# Ends at ten times the corner that 100 pF beside 100 kohm sets.
NARROW: FloatArray = np.logspace(2, 5.2, 41)
_TEXT = """
name = "invented inverter"
revision = "A"
[[stage]]
topology = "inverting"
input = "10k"
feedback = "100k"
{stage}
amplifier = "main"
[amplifier.main]
gbw = {{ min = "1 MHz", typical = "3 MHz" }}
open_loop_gain = "200k"
{amplifier}
[tolerance]
resistor = "{resistor}"
capacitor = "{capacitor}"
[budget]
rule = "simple"
gbw = {{ min = "1 MHz" }}
"""
CAPACITOR = 'feedback_capacitor = "100p"'


def made(
    stage: str = "", amplifier: str = "", *, resistor: str = "1%", capacitor: str = "10%"
) -> Design:
    """Return a design with some parts more."""
    text = _TEXT.format(stage=stage, amplifier=amplifier, resistor=resistor, capacitor=capacitor)
    return parse_design(text, where="test")


def measured(
    design: Design, frequency_hz: FloatArray, *, gbw_hz: float = 2.6e6, noise: float = 0.0
) -> GainCurve:
    """Return what a nominal board with another amplifier gives."""
    scatter = np.random.default_rng(1).standard_normal(frequency_hz.size)
    exact = np.abs(design.chain().response(frequency_hz, gbw_hz=gbw_hz))
    return GainCurve(frequency_hz, exact * np.exp(noise * scatter))


def test_feedback_capacitor_hides_the_amplifier() -> None:
    """With 0.3 % noise and a 10 % capacitor only a lower bound comes out, and what hides it."""
    design = made(CAPACITOR)
    figures = extract(measured(design, NARROW, noise=3e-3), design)
    assert figures.gbw_hz is not None
    assert (figures.gbw_hz.bound, figures.gbw_hz.u) == ("at least", None)
    assert figures.gbw_hz.value < 2.6e6
    assert figures.limited_by == "stage[1].feedback_capacitor"
    assert [reason.code for reason in figures.validity] == ["GBW hidden"]
    assert figures.corner_hz is not None
    assert figures.corner_hz.u is not None
    assert judge(figures, design.budget).lines[0].basis == "bound"
    assert judge(figures, design.budget).overall == "pass"


def test_exact_parts_and_no_noise_give_a_number() -> None:
    """With tolerance 0 and no noise the same capacitor hides nothing."""
    design = made(CAPACITOR, resistor="0%", capacitor="0%")
    figures = extract(measured(design, NARROW), design)
    assert figures.gbw_hz is not None
    assert figures.gbw_hz.bound is None
    assert figures.gbw_hz.value == pytest.approx(2.6e6, rel=1e-3)


@pytest.mark.parametrize(
    ("stage", "amplifier"),
    [
        pytest.param(CAPACITOR, "", id="capacitor, wide sweep"),
        pytest.param('feedback_capacitor = "5p"', "", id="small capacitor"),
        pytest.param("", 'second_pole = "6 MHz"', id="second pole"),
        pytest.param('coupling = "1u"', "", id="coupling"),
    ],
)
def test_number(stage: str, amplifier: str) -> None:
    """Where the sweep shows both, the GBW is a number within its uncertainty."""
    design = made(stage, amplifier)
    figures = extract(measured(design, WIDE, noise=1e-3), design)
    assert figures.gbw_hz is not None
    assert figures.gbw_hz.u is not None
    assert figures.gbw_basis == "design"
    assert abs(figures.gbw_hz.value - 2.6e6) < 3 * figures.gbw_hz.u
    assert figures.gbw_hz.u < 0.03 * 2.6e6
    total = math.sqrt(sum(term.u**2 for term in figures.gbw_hz.terms))
    assert total == pytest.approx(figures.gbw_hz.u, rel=1e-9)


def test_two_stages() -> None:
    """Two stages with one kind of amplifier: its GBW through both."""
    text = _TEXT.format(stage="", amplifier="", resistor="1%", capacitor="10%")
    second = '[[stage]]\ntopology = "non-inverting"\nfeedback = "4k7"\nground = "1k"\n'
    design = parse_design(
        text.replace("[amplifier.main]", second + 'amplifier = "main"\n[amplifier.main]'), where="t"
    )
    figures = extract(measured(design, WIDE, noise=1e-3), design)
    assert figures.gbw_hz is not None
    assert figures.gbw_hz.u is not None
    assert abs(figures.gbw_hz.value - 2.6e6) < 3 * figures.gbw_hz.u


def test_design_that_does_not_explain_the_curve() -> None:
    """A capacitor of twice its value leaves no GBW, and the reason."""
    design = made(CAPACITOR)
    other = made('feedback_capacitor = "200p"')
    figures = extract(measured(other, NARROW, noise=1e-3), design)
    assert figures.gbw_hz is None
    assert "noise gain unknown" in [reason.code for reason in figures.validity]


def test_corner_above_the_sweep_bounds_gbw() -> None:
    """A sweep that ends before the corner bounds the GBW from below, never a number."""
    design = made()
    curve = measured(design, np.logspace(2, 4.6, 41), noise=1e-3)
    figures = extract(curve, design)
    assert figures.gbw_hz is not None
    assert figures.gbw_hz.bound == "at least"
    assert figures.gbw_hz.value < 2.6e6
    assert [reason.code for reason in figures.validity] == ["corner above the sweep"]


def test_scale_of_the_meter_does_not_move_gbw() -> None:
    """A scale term wide enough for a wrong meter leaves the design able to explain the curve."""
    design = made('coupling = "1u"')
    curve = measured(design, WIDE, noise=1e-3)
    off = GainCurve(
        curve.frequency_hz,
        curve.gain * 1.05,
        terms=(Term(name="meter", kind="scale", u_rel=0.03),),
    )
    figures = extract(off, design)
    assert figures.gbw_hz is not None
    assert figures.gbw_hz.u is not None
    assert abs(figures.gbw_hz.value - 2.6e6) < 3 * figures.gbw_hz.u


def test_one_and_many_agree() -> None:
    """Arrays hold the number, and NaN with a bit where there is only a bound."""
    design = made(CAPACITOR)
    wide, narrow = measured(design, WIDE, noise=1e-3), measured(design, NARROW, noise=3e-3)
    rows, frequencies = np.full((2, 2, 51), np.nan)
    for row, curve in enumerate((wide, narrow)):
        rows[row, : len(curve)], frequencies[row, : len(curve)] = curve.gain, curve.frequency_hz
    many = extract_many(frequencies, rows, design)
    one = extract(wide, design).gbw_hz
    assert one is not None
    assert many["gbw_hz"][0] == pytest.approx(one.value, rel=1e-6)
    assert np.isnan(many["gbw_hz"][1])
    assert many["validity"][1] == int(Fault.GBW_HIDDEN)


def test_derivatives_of_the_designs_response() -> None:
    """The central differences agree with others of twice the step, to their order."""
    shape = Designed(made(CAPACITOR, 'second_pole = "6 MHz"').chain(), u_scale=0.01)
    centre = shape.start(np.zeros((1, 1)), np.zeros((1, 1)), np.zeros((1, 1)))
    x = np.log(WIDE)[None, :]
    _, given = shape.evaluate(centre, x)
    for place in range(centre.shape[1]):
        move = np.zeros_like(centre)
        move[0, place] = 2e-4
        slope = (shape.ln_gain(centre + move, x) - shape.ln_gain(centre - move, x))[0] / 4e-4
        assert given[0, :, place] == pytest.approx(slope, abs=1e-7)


@pytest.mark.parametrize("boards", [25, pytest.param(2000, marks=pytest.mark.long)])
def test_coverage_over_boards_with_spread_parts(boards: int) -> None:
    """Boards whose parts lie anywhere within tolerance: at least 92 % of intervals hold the GBW."""
    design = made('feedback_capacitor = "5p"')
    chain, rng = design.chain(), np.random.default_rng(3)
    inside = []
    for _ in range(boards):
        factors = {
            part.name: float(1 + part.tolerance * rng.uniform(-1, 1)) for part in chain.parts()
        }
        exact = np.abs(chain.response(WIDE, gbw_hz=2.6e6, factors=factors))
        curve = GainCurve(WIDE, exact * np.exp(1e-3 * rng.standard_normal(51)))
        found = extract(curve, design).gbw_hz
        if found is not None and found.U is not None:
            inside.append(abs(found.value - 2.6e6) < found.U)
    assert len(inside) > 0.95 * boards
    assert np.mean(inside) >= 0.92


def test_shape_design() -> None:
    """The design's own response gives the figures of the netlist it stands for."""
    design = made(CAPACITOR, 'second_pole = "6 MHz"')
    curve = measured(design, WIDE, gbw_hz=3e6, noise=1e-3)
    figures = extract(curve, design, shape="design")
    nominal = nominal_figures(design.chain())
    assert figures.shape == "design"
    assert figures.validity == ()
    assert nominal.corner_hz is not None
    for figure, truth in (
        (figures.gain, nominal.gain),
        (figures.corner_hz, nominal.corner_hz),
        (figures.gbw_hz, 3e6),
    ):
        assert figure is not None
        assert figure.u is not None
        assert abs(figure.value - truth) < 3.5 * figure.u
        total = math.sqrt(sum(term.u**2 for term in figure.terms))
        assert total == pytest.approx(figure.u, rel=1e-9)


def test_shape_design_keeps_the_bound() -> None:
    """Gain and corner are numbers, the hidden GBW a bound."""
    design = made(CAPACITOR)
    figures = extract(measured(design, NARROW, noise=3e-3), design, shape="design")
    assert figures.gbw_hz is not None
    assert figures.gbw_hz.bound == "at least"
    assert figures.corner_hz is not None
    assert figures.corner_hz.u is not None
    assert 0 < figures.corner_hz.u < 0.02 * figures.corner_hz.value


def test_design_explains_what_no_simple_shape_does() -> None:
    """A non-inverting stage with a feedback capacitor falls to a gain of one, not to zero."""
    text = _TEXT.format(stage=CAPACITOR, amplifier="", resistor="1%", capacitor="10%")
    text = text.replace('"inverting"', '"non-inverting"').replace("input =", "ground =")
    design = parse_design(text, where="t")
    curve = measured(design, np.logspace(2, 7.5, 56), noise=1e-3)
    figures = extract(curve, design)
    assert figures.shape == "design"
    assert "own response" in figures.chosen_because
    assert figures.gbw_hz is not None
    assert figures.gbw_hz.u is not None
    assert abs(figures.gbw_hz.value - 2.6e6) < 3.5 * figures.gbw_hz.u
    many = extract_many(curve.frequency_hz, curve.gain[None, :], design)
    assert many["shape"][0] == "design"
    assert many["gbw_hz"][0] == pytest.approx(figures.gbw_hz.value, rel=1e-6)


def test_shape_design_needs_a_design() -> None:
    """Without one there is no such shape."""
    curve = measured(made(), WIDE)
    with pytest.raises(Misuse, match="needs a design"):
        extract(curve, shape="design")
    with pytest.raises(Misuse, match="needs a design"):
        extract_many(WIDE, curve.gain[None, :], shape="design")


def test_wild_point_beside_the_designs_response() -> None:
    """The design's own fit finds a wild point, and figures are those without it."""
    design = made(CAPACITOR, 'second_pole = "6 MHz"')
    curve = measured(design, WIDE, noise=1e-3)
    gain, rest = curve.gain.copy(), np.arange(len(curve)) != 20
    gain[20] *= 1.05
    figures = extract(GainCurve(WIDE, gain), design, shape="design")
    without = extract(GainCurve(WIDE[rest], curve.gain[rest]), design, shape="design")
    assert figures.left_out == (20,)
    assert figures.gbw_hz is not None
    assert without.gbw_hz is not None
    assert figures.gbw_hz.value == pytest.approx(without.gbw_hz.value, rel=1e-6)
