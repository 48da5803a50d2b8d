"""Designs as read: stages, amplifiers, tolerances, budget, drive and sweep."""

import json
import math

import numpy as np
import pytest

from benchlog.circuit.nominal import nominal_figures
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
from benchlog.design.budget import LINE_KINDS
from benchlog.design.example import EXAMPLE_DESIGN
from benchlog.design.model import Design, LevelAbove, Line
from benchlog.design.read import parse_design
from benchlog.errors import DesignFileError
from benchlog.records import FIGURE_NAMES

HEAD = 'name = "test"\nrevision = "C"\n'
AMPLIFIER = '[amplifier.main]\ngbw = "3 MHz"\nopen_loop_gain = "106 dB"\n'
BUDGET = '[budget]\ncorner = { min = "1 kHz" }\n'


def design_of(*tables: str) -> Design:
    """Return a design with these tables and a budget."""
    return parse_design("\n".join((HEAD, *tables, BUDGET)), where="test.toml")


def stage_of(keys: str) -> Stage:
    """Return the only stage of a design."""
    return design_of(f'[[stage]]\namplifier = "main"\n{keys}', AMPLIFIER).stages[0].stage


@pytest.mark.parametrize(
    ("keys", "stage"),
    [
        ('topology = "follower"', Follower()),
        (
            'topology = "follower"\nbias = "47k"\ncoupling = "1u"',
            Follower(bias_ohm=47e3, coupling_f=1e-6),
        ),
        (
            'topology = "non-inverting"\nfeedback = "47k"\nground = 1000\nground_capacitor = "1u"',
            NonInverting(feedback_ohm=47e3, ground_ohm=1e3, ground_capacitor_f=1e-6),
        ),
        (
            'topology = "inverting"\ninput = "10k"\nfeedback = "47k"\nfeedback_capacitor = "22p"\n'
            'coupling = "1u"\ninput_capacitance = "5p"',
            Inverting(
                input_ohm=10e3,
                feedback_ohm=47e3,
                feedback_capacitor_f=22e-12,
                coupling_f=1e-6,
                input_capacitance_f=5e-12,
            ),
        ),
        (
            'topology = "summing"\ninputs = ["22k", "33k"]\nfeedback = "47k"\ndriven = 2\n'
            'undriven = "open"',
            Summing(inputs_ohm=(22e3, 33e3), feedback_ohm=47e3, driven=2, undriven="open"),
        ),
        (
            'topology = "difference"\ninput = "1k"\nfeedback = "10k"\nplus_input = "1k"\n'
            'plus_ground = "10k"\ndriven = "plus"',
            Difference(
                input_ohm=1e3,
                feedback_ohm=10e3,
                plus_input_ohm=1e3,
                plus_ground_ohm=10e3,
                driven="plus",
            ),
        ),
        ('topology = "open-loop"', OpenLoop()),
    ],
    ids=range(7),
)
def test_each_topology_becomes_its_circuit(keys: str, stage: Stage) -> None:
    """Every key lands in the field of its name, in ohms and farads."""
    assert stage_of(keys) == stage


def test_a_passive_design_needs_no_amplifier() -> None:
    """A divider alone has a response and no GBW."""
    design = design_of('[[stage]]\ntopology = "divider"\nseries = "10k"\ncapacitor = "1n"')
    assert design.stages[0].stage == Divider(series_ohm=10e3, capacitor_f=1e-9)
    assert design.figure_amplifier is None
    assert nominal_figures(design.chain()).gbw_hz is None


def test_the_example_meets_its_own_budget() -> None:
    """What a new bench folder starts with passes, with the figures it promises."""
    design = parse_design(EXAMPLE_DESIGN, where="example")
    found = nominal_figures(design.chain())
    assert design.budget.rule == "four-state"
    assert [line.figure for line in design.budget.lines] == [
        "gain_db",
        "corner_hz",
        "gbw_hz",
        "peaking_db",
    ]
    assert found.gain_db == pytest.approx(33.62, abs=0.005)
    assert found.corner_hz == pytest.approx(62.5e3, rel=1e-3)
    for line in design.budget.lines:
        value = getattr(found, line.figure)
        assert line.minimum is None or line.minimum <= value
        assert line.maximum is None or value <= line.maximum
    assert design.drive_level_vrms == pytest.approx(0.02 / math.sqrt(8))
    assert design.rails_v == (-12.0, 12.0)


def test_stages_share_an_amplifier_or_name_whose_gbw_is_the_figure() -> None:
    """With two amplifiers the file must say; the chain follows it."""
    stage = '[[stage]]\ntopology = "follower"\namplifier = "{}"'
    both = [stage.format("main"), stage.format("output")]
    second = '[amplifier.output]\ngbw = { min = "8 MHz", typical = "10 MHz" }\n'
    shared = design_of(stage.format("main"), stage.format("main"), AMPLIFIER)
    assert shared.chain().figure_stages == (1, 2)

    with pytest.raises(DesignFileError, match="nothing says whose GBW is the figure") as refused:
        design_of(*both, AMPLIFIER, second)
    assert refused.value.where == "test.toml: gbw_of"
    with pytest.raises(DesignFileError, match="gbw_of is 'spare', and no amplifier has that name"):
        design_of('gbw_of = "spare"', *both, AMPLIFIER, second)

    chain = design_of('gbw_of = "output"', *both, AMPLIFIER, second).chain()
    assert chain.gbw_hz == 10e6
    assert chain.figure_stages == (2,)
    assert [part.name for part in chain.parts()] == ["amplifier.main.gbw"]


@pytest.mark.parametrize(
    ("gbw", "typical_hz", "tolerance"),
    [
        ('"3 MHz"', 3e6, 0.2),
        ('{ min = "2 MHz", typical = "3 MHz", max = "4 MHz" }', 3e6, 1 / 3),
        ('{ min = "2 MHz", max = "8 MHz" }', 4e6, 1.0),
        ('{ min = "2 MHz" }', 2e6, 0.2),
        ('{ typical = "3 MHz" }', 3e6, 0.2),
        ("3e6", 3e6, 0.2),
    ],
)
def test_typical_gbw_and_its_spread(gbw: str, typical_hz: float, tolerance: float) -> None:
    """As stated, else the geometric mean of what is; a fifth where no end is known."""
    design = design_of(
        '[[stage]]\ntopology = "follower"\namplifier = "main"', f"[amplifier.main]\ngbw = {gbw}"
    )
    assert design.amplifiers[0].gbw_hz == pytest.approx(typical_hz)
    assert design.tolerances["amplifier.main.gbw"] == pytest.approx(tolerance)
    assert math.isinf(design.amplifiers[0].open_loop_gain)


@pytest.mark.parametrize(
    ("swing", "rails", "above_v", "below_v"),
    [
        ('output_swing = "10.5 V"', "", 10.5, 10.5),
        ('output_swing = ["-9 V", "10.5 V"]', "", 10.5, 9.0),
        ('output_swing = "10.5 V"', 'rails = ["-5 V", "12 V"]', 10.5, 5.0),
        ("", 'rails = ["-12 V", "15 V"]', 15.0, 12.0),
        ("", 'rails = ["0 V", "5 V"]', 2.5, 2.5),
        ("", "", None, None),
    ],
)
def test_swing_is_what_amplifier_and_rails_allow(
    swing: str, rails: str, above_v: float | None, below_v: float | None
) -> None:
    """Both sides as positive peaks; a single supply rests at its middle."""
    design = design_of(
        rails,
        '[[stage]]\ntopology = "follower"\namplifier = "main"',
        f'[amplifier.main]\ngbw = "3 MHz"\n{swing}',
    )
    amplifier = design.amplifiers[0]
    assert (amplifier.output_swing_v, amplifier.output_swing_negative_v) == (above_v, below_v)


def test_every_part_of_the_chain_has_a_tolerance() -> None:
    """Its own, else the table's, else the default for its kind."""
    design = design_of(
        '[[stage]]\ntopology = "inverting"\namplifier = "main"\ninput = "10k"\n'
        'feedback = { value = "47k", tolerance = "0.1%", series = "E24" }\ncoupling = "1u"',
        '[amplifier.main]\ngbw = "3 MHz"\nsecond_pole = { value = "9 MHz", tolerance = "30%" }\n',
        '[tolerance]\nresistor = "2%"\n',
    )
    parts = {part.name: part.tolerance for part in design.chain().parts()}
    assert parts == {
        "stage[1].input": 0.02,
        "stage[1].feedback": 0.001,
        "stage[1].coupling": 0.1,
        "amplifier.main.second_pole": 0.3,
    }


def test_each_leg_of_a_summing_stage_has_a_tolerance() -> None:
    """Legs are counted from 1, as in the file."""
    design = design_of(
        '[[stage]]\ntopology = "summing"\namplifier = "main"\nfeedback = "47k"\n'
        'inputs = ["22k", { value = "33k", tolerance = "5%" }]',
        AMPLIFIER,
    )
    assert design.tolerances["stage[1].inputs[1]"] == 0.01
    assert design.tolerances["stage[1].inputs[2]"] == 0.05


@pytest.mark.parametrize(
    ("keys", "path", "what"),
    [
        (
            'topology = "follower"\ncoupling = "1u"',
            "stage[1].bias",
            "stage[1] has a coupling capacitor and nothing that biases the input behind it",
        ),
        (
            'topology = "summing"\ninputs = ["22k"]\nfeedback = "47k"',
            "stage[1].inputs",
            "stage[1].inputs has 1 value(s)",
        ),
        (
            'topology = "summing"\ninputs = ["22k", "0"]\nfeedback = "47k"',
            "stage[1].inputs[2]",
            "stage[1].inputs[2]: '0' is zero",
        ),
        (
            'topology = "summing"\ninputs = ["22k", true]\nfeedback = "47k"',
            "stage[1].inputs[2]",
            "stage[1].inputs[2] is true",
        ),
        (
            'topology = "summing"\ninputs = ["22k", "33k"]\nfeedback = "47k"\ndriven = 3',
            "stage[1].driven",
            "stage[1].driven is 3, and there are 2 inputs",
        ),
    ],
)
def test_parts_that_make_no_circuit(keys: str, path: str, what: str) -> None:
    """What the keys alone do not show is refused too, with its place."""
    with pytest.raises(DesignFileError) as refused:
        stage_of(keys)
    assert (refused.value.where, refused.value.what) == (f"test.toml: {path}", what)


def test_an_empty_divider_and_an_open_loop_without_gain() -> None:
    """Neither would be a stage."""
    with pytest.raises(DesignFileError, match="divides nothing"):
        design_of('[[stage]]\ntopology = "divider"\nseries = "10k"')
    with pytest.raises(DesignFileError, match="open_loop_gain is missing") as refused:
        design_of(
            '[[stage]]\ntopology = "open-loop"\namplifier = "main"',
            '[amplifier.main]\ngbw = "3 MHz"',
        )
    assert refused.value.where == "test.toml: amplifier.main.open_loop_gain"


def test_budget_lines_keep_key_unit_and_what_differs() -> None:
    """Gain in the unit it is written in; rule and guard of a line only where it has its own."""
    text = "\n".join(
        (
            HEAD,
            '[[stage]]\ntopology = "follower"\namplifier = "main"',
            AMPLIFIER,
            "[budget]\nguard = 0.5",
            'gain = { min = "0.99", max = 1.01, rule = "simple" }',
            'corner = { min = "1 MHz", guard = 2 }',
            'gbw = { min = "3 MHz", max = "3 MHz" }',
            'peaking = { max = "1 dB" }',
        )
    )
    budget = parse_design(text, where="test.toml").budget
    assert (budget.rule, budget.guard) == ("guarded", 0.5)
    assert budget.lines == (
        Line(figure="gain", key="gain", minimum=0.99, maximum=1.01, unit="V/V", rule="simple"),
        Line(figure="corner_hz", key="corner", minimum=1e6, maximum=None, unit="Hz", guard=2.0),
        Line(figure="gbw_hz", key="gbw", minimum=3e6, maximum=3e6, unit="Hz"),
        Line(figure="peaking_db", key="peaking", minimum=None, maximum=1.0, unit="dB"),
    )
    as_data = json.loads(budget.text())
    assert as_data["lines"][0]["maximum"] == 1.01
    assert budget.text() == parse_design(text, where="again").budget.text()


def test_budget_keys_stand_for_figures_that_exist() -> None:
    """Every key of a budget names a field of the figures."""
    assert {kind.figure for kind in LINE_KINDS.values()} <= set(FIGURE_NAMES)


def test_a_budget_without_lines_is_none() -> None:
    """A rule alone judges nothing."""
    with pytest.raises(DesignFileError, match="the budget has no limits") as refused:
        parse_design(EXAMPLE_DESIGN.partition("gain = {")[0], where="test.toml")
    assert refused.value.where == "test.toml: budget"


def test_sweep_settings_and_levels() -> None:
    """Levels hold from their frequency upwards, above the drive level."""
    design = design_of(
        '[[stage]]\ntopology = "follower"\namplifier = "main"',
        AMPLIFIER,
        '[drive]\nlevel = "100 mVrms"\n[sweep]\nstart = "10 Hz"\nstop = "1 MHz"\nper_decade = 10\n'
        'level = [{ above = "10 kHz", level = "50 mVrms" }, { above = "100k", level = "-40 dBV" }]',
    )
    assert (design.sweep.start_hz, design.sweep.stop_hz, design.sweep.per_decade) == (10, 1e6, 10)
    assert design.sweep.levels[0] == LevelAbove(above_hz=1e4, level_vrms=0.05)
    levels = [design.drive_level_at(hz) for hz in (10.0, 9_999.0, 10e3, 1e6)]
    np.testing.assert_allclose(levels, [0.1, 0.1, 0.05, 0.01])  # type: ignore[arg-type]


def test_one_sweep_level_holds_everywhere_and_none_is_left_open() -> None:
    """A text instead of a list; without any level the tool has to be told."""
    stage = '[[stage]]\ntopology = "follower"\namplifier = "main"'
    design = design_of(stage, AMPLIFIER, '[sweep]\nlevel = "50 mVrms"')
    assert design.drive_level_at(1.0) == pytest.approx(0.05)
    assert design_of(stage, AMPLIFIER).drive_level_at(1.0) is None
