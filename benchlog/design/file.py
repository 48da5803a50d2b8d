"""The design file as data: which keys there are, and what each may hold.

Unknown keys are refused everywhere: a misspelt ``max`` must not become "no upper limit".  Each
entry carries the name of the parser in ``quantity`` that reads it, and an example, so that a
complaint can say what was expected.  The JSON schema of design files is made from ``DesignFile``.
"""

from typing import Annotated, Literal, TypeAlias

from msgspec import UNSET, Meta, Struct, UnsetType, field

Series: TypeAlias = Literal["E3", "E6", "E12", "E24", "E48", "E96", "E192"]
Rule: TypeAlias = Literal["simple", "guarded", "four-state", "guarded-rejection"]


class PartFile(Struct, forbid_unknown_fields=True, kw_only=True):
    """A part with a tolerance of its own, or held to a series of preferred values."""

    value: Annotated[str | int | float, Meta(description="the part's value", examples=["47k"])]
    tolerance: Annotated[str, Meta(description="a percentage", examples=["0.1%"])] | UnsetType = (
        UNSET
    )
    series: Series | UnsetType = UNSET


Ohm: TypeAlias = Annotated[
    str | int | float | PartFile,
    Meta(description="a resistance", examples=["47k"], extra={"quantity": "ohm"}),
]
Farad: TypeAlias = Annotated[
    str | int | float | PartFile,
    Meta(description="a capacitance", examples=["22p"], extra={"quantity": "farad"}),
]
Pole: TypeAlias = Annotated[
    str | int | float | PartFile, Meta(description="a frequency", examples=["9 MHz"])
]
Hertz: TypeAlias = Annotated[
    str | int | float, Meta(description="a frequency", examples=["10 kHz"])
]
Volt: TypeAlias = Annotated[str | int | float, Meta(description="a voltage", examples=["12 V"])]
Level: TypeAlias = Annotated[str, Meta(description="a level", examples=["20 mVpp"])]
Percent: TypeAlias = Annotated[str, Meta(description="a percentage", examples=["1%"])]
Name: TypeAlias = Annotated[str, Meta(description="a text", examples=["line preamp"])]
Revision: TypeAlias = Annotated[str, Meta(description="a text", examples=["C"])]
AmplifierName: TypeAlias = Annotated[
    str, Meta(description="the name of an [amplifier.NAME] table", examples=["main"])
]


class FollowerFile(
    Struct, forbid_unknown_fields=True, kw_only=True, tag_field="topology", tag="follower"
):
    """Output tied to the minus input."""

    amplifier: AmplifierName
    feedback: Ohm | UnsetType = UNSET
    feedback_capacitor: Farad | UnsetType = UNSET
    input_capacitance: Farad | UnsetType = UNSET
    bias: Ohm | UnsetType = UNSET
    coupling: Farad | UnsetType = UNSET


class NonInvertingFile(
    Struct, forbid_unknown_fields=True, kw_only=True, tag_field="topology", tag="non-inverting"
):
    """Signal at the plus input; coupling needs a bias resistor behind it."""

    amplifier: AmplifierName
    feedback: Ohm
    ground: Ohm
    feedback_capacitor: Farad | UnsetType = UNSET
    ground_capacitor: Farad | UnsetType = UNSET
    input_capacitance: Farad | UnsetType = UNSET
    bias: Ohm | UnsetType = UNSET
    coupling: Farad | UnsetType = UNSET


class InvertingFile(
    Struct, forbid_unknown_fields=True, kw_only=True, tag_field="topology", tag="inverting"
):
    """Signal through an input leg to the minus input."""

    amplifier: AmplifierName
    input: Ohm
    feedback: Ohm
    feedback_capacitor: Farad | UnsetType = UNSET
    input_capacitance: Farad | UnsetType = UNSET
    coupling: Farad | UnsetType = UNSET


class SummingFile(
    Struct, forbid_unknown_fields=True, kw_only=True, tag_field="topology", tag="summing"
):
    """Several input legs, one of them driven (counted from 1)."""

    amplifier: AmplifierName
    inputs: list[Ohm]
    feedback: Ohm
    driven: Annotated[
        int, Meta(description="the number of an input, from 1", examples=[1], ge=1, le=100)
    ] = 1
    undriven: Literal["grounded", "open"] = "grounded"
    undriven_source: Ohm | UnsetType = UNSET
    feedback_capacitor: Farad | UnsetType = UNSET
    input_capacitance: Farad | UnsetType = UNSET
    coupling: Farad | UnsetType = UNSET


class DifferenceFile(
    Struct, forbid_unknown_fields=True, kw_only=True, tag_field="topology", tag="difference"
):
    """One leg at the minus input, a divider at the plus input."""

    amplifier: AmplifierName
    input: Ohm
    feedback: Ohm
    plus_input: Ohm
    plus_ground: Ohm
    driven: Literal["plus", "minus", "both"] = "both"
    feedback_capacitor: Farad | UnsetType = UNSET
    plus_ground_capacitor: Farad | UnsetType = UNSET
    input_capacitance: Farad | UnsetType = UNSET


class OpenLoopFile(
    Struct, forbid_unknown_fields=True, kw_only=True, tag_field="topology", tag="open-loop"
):
    """The amplifier alone, measured at its own input."""

    amplifier: AmplifierName


class DividerFile(
    Struct, forbid_unknown_fields=True, kw_only=True, tag_field="topology", tag="divider"
):
    """A passive stage: in series, then to ground; it needs a shunt or a capacitor."""

    series: Ohm
    shunt: Ohm | UnsetType = UNSET
    capacitor: Farad | UnsetType = UNSET


StageFile: TypeAlias = (
    FollowerFile
    | NonInvertingFile
    | InvertingFile
    | SummingFile
    | DifferenceFile
    | OpenLoopFile
    | DividerFile
)


class GbwFile(Struct, forbid_unknown_fields=True, kw_only=True):
    """The spread of an amplifier's gain-bandwidth product."""

    minimum: Hertz | UnsetType = field(name="min", default=UNSET)
    typical: Hertz | UnsetType = UNSET
    maximum: Hertz | UnsetType = field(name="max", default=UNSET)


class AmplifierFile(Struct, forbid_unknown_fields=True, kw_only=True):
    """An amplifier by the numbers of its data sheet."""

    gbw: Annotated[
        str | int | float | GbwFile,
        Meta(
            description="a gain-bandwidth product",
            examples=["3 MHz", {"min": "2 MHz", "typical": "3 MHz", "max": "4 MHz"}],
        ),
    ]
    open_loop_gain: (
        Annotated[str | int | float, Meta(description="a gain", examples=["106 dB", "200k"])]
        | UnsetType
    ) = UNSET
    slew_rate: Annotated[str, Meta(description="a slew rate", examples=["13 V/us"])] | UnsetType = (
        UNSET
    )
    output_swing: (
        Annotated[
            str | int | float | list[str | int | float],
            Meta(
                description="a peak voltage, or the lowest and the highest",
                examples=["10.5 V", ["-9 V", "10.5 V"]],
            ),
        ]
        | UnsetType
    ) = UNSET
    second_pole: Pole | UnsetType = UNSET


class ToleranceFile(Struct, forbid_unknown_fields=True, kw_only=True):
    """Tolerance of every part that has none of its own."""

    resistor: Percent | UnsetType = UNSET
    capacitor: Percent | UnsetType = UNSET
    second_pole: Percent | UnsetType = UNSET


class DriveFile(Struct, forbid_unknown_fields=True, kw_only=True):
    """How hard to drive the board, at its input."""

    level: Level


class LevelAboveFile(Struct, forbid_unknown_fields=True, kw_only=True):
    """A level that holds from a frequency upwards."""

    above: Hertz
    level: Level


class SweepFile(Struct, forbid_unknown_fields=True, kw_only=True):
    """How to sweep the board; what is left out follows from the predicted corners."""

    start: Hertz | UnsetType = UNSET
    stop: Hertz | UnsetType = UNSET
    per_decade: (
        Annotated[
            int, Meta(description="1 to 1000 points per decade", examples=[10], ge=1, le=1000)
        ]
        | UnsetType
    ) = UNSET
    level: (
        Annotated[
            str | list[LevelAboveFile],
            Meta(
                description="a level, or a list of levels",
                examples=["20 mVpp", [{"above": "10 kHz", "level": "10 mVpp"}]],
            ),
        ]
        | UnsetType
    ) = UNSET


class LineFile(Struct, forbid_unknown_fields=True, kw_only=True):
    """Limits of one figure: at least one of them."""

    minimum: (
        Annotated[str | int | float, Meta(description="a limit", examples=["40 kHz"])] | UnsetType
    ) = field(name="min", default=UNSET)
    maximum: (
        Annotated[str | int | float, Meta(description="a limit", examples=["33.9 dB"])] | UnsetType
    ) = field(name="max", default=UNSET)
    rule: Rule | UnsetType = UNSET
    guard: Annotated[float, Meta(description="a number", examples=[1.0])] | UnsetType = UNSET


Limits: TypeAlias = Annotated[LineFile, Meta(description="limits", examples=[{"min": "40 kHz"}])]


class BudgetFile(Struct, forbid_unknown_fields=True, kw_only=True):
    """What a board must meet: at least one line."""

    rule: Rule = "guarded"
    guard: Annotated[float, Meta(description="a number", examples=[1.0])] = 1.0
    gain: Limits | UnsetType = UNSET
    corner: Limits | UnsetType = UNSET
    lower_corner: Limits | UnsetType = UNSET
    bandwidth: Limits | UnsetType = UNSET
    gbw: Limits | UnsetType = UNSET
    peaking: Limits | UnsetType = UNSET
    peaking_frequency: Limits | UnsetType = UNSET
    unity: Limits | UnsetType = UNSET


class DesignFile(Struct, forbid_unknown_fields=True, kw_only=True):
    """A design: the circuit a board is built to, and what it must meet."""

    name: Name
    revision: Revision
    stage: Annotated[
        list[StageFile],
        Meta(
            description="a [[stage]] table for each of 1 to 12 stages", min_length=1, max_length=12
        ),
    ]
    budget: BudgetFile
    amplifier: dict[str, AmplifierFile] = {}
    gbw_of: AmplifierName | UnsetType = UNSET
    rails: (
        Annotated[
            list[Volt],
            Meta(
                description="the lowest and the highest supply voltage",
                examples=[["-12 V", "12 V"]],
            ),
        ]
        | UnsetType
    ) = UNSET
    tolerance: ToleranceFile = field(default_factory=ToleranceFile)
    drive: DriveFile | UnsetType = UNSET
    sweep: SweepFile = field(default_factory=SweepFile)
