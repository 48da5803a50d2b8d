"""How the stages of a board are wired: from part values to a netlist."""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

from benchlog.practice.nodes import EMF, GROUND, Netlist, Node, OpAmp

BOARD_INPUT = "board input"


@dataclass(frozen=True, slots=True, kw_only=True)
class StageKind:
    """What of a stage is no value: its topology, its amplifier, which leg is driven.

    Attributes:
        topology: A word of the design file.
        amplifier: Name of its amplifier; None for a passive stage.
        legs: How many input legs a summing stage has.
        driven: Which leg is driven: a number from 1 (summing), ``"plus"``, ``"minus"`` or
            ``"both"`` (difference).
        grounded: Whether the legs that are not driven are grounded; they hang open otherwise.
    """

    topology: str
    amplifier: str | None
    legs: int = 0
    driven: int | str = 1
    grounded: bool = True


def stage_output(number: int) -> Node:
    """Return the node at the output of a stage, counted from 1."""
    return f"stage {number} output"


def amplifier_values(values: Mapping[str, float], name: str) -> OpAmp:
    """Return an amplifier's open loop out of the part values."""
    prefix = f"amplifier.{name}."
    return OpAmp(
        gbw_hz=values[prefix + "gbw"],
        open_loop_gain=values.get(prefix + "open_loop_gain", float("inf")),
        second_pole_hz=values.get(prefix + "second_pole"),
    )


def wire_board(
    kinds: Sequence[StageKind], values: Mapping[str, float], *, source_ohm: float
) -> Netlist:
    """Wire a source with its output resistance to stages in a chain.

    Args:
        kinds: The stages in order.
        values: Part values by their path in the design file, ``"stage[1].feedback"``, ohm,
            farad, hertz.
        source_ohm: Output resistance of the source.
    """
    net = Netlist()
    # A source without resistance would force a node twice; a micro-ohm is none.
    net.resistor(EMF, BOARD_INPUT, max(source_ohm, 1e-6))
    node = BOARD_INPUT
    for number, kind in enumerate(kinds, start=1):
        stage = _Stage(net, number, kind, values)
        _WIRINGS[kind.topology](stage, node)
        node = stage_output(number)
    return net


@dataclass(frozen=True, slots=True)
class _Stage:
    net: Netlist
    number: int
    kind: StageKind
    values: Mapping[str, float]

    def node(self, name: str) -> Node:
        return f"stage {self.number} {name}"

    @property
    def out(self) -> Node:
        return stage_output(self.number)

    def value(self, key: str) -> float:
        return self.values[f"stage[{self.number}].{key}"]

    def optional(self, key: str) -> float | None:
        return self.values.get(f"stage[{self.number}].{key}")

    def place_amplifier(self, plus: Node, minus: Node) -> None:
        if self.kind.amplifier is None:
            raise ValueError(f"stage {self.number} has no amplifier")
        amplifier = amplifier_values(self.values, self.kind.amplifier)
        self.net.op_amp(plus, minus, out=self.out, amplifier=amplifier)

    def feed_back(self, minus: Node) -> None:
        """Close the loop, and load the minus input by its own capacitance."""
        self.net.resistor(minus, self.out, self.value("feedback"))
        self.bypass(minus, self.out, "feedback_capacitor")
        self.bypass(minus, GROUND, "input_capacitance")

    def bypass(self, one: Node, other: Node, key: str) -> None:
        """Connect two nodes by a capacitor, where there is one."""
        capacitor = self.optional(key)
        if capacitor is not None:
            self.net.capacitor(one, other, capacitor)

    def couple(self, node: Node, leg: int = 1) -> Node:
        """Return the node behind the coupling capacitor, or the same where there is none."""
        if self.optional("coupling") is None:
            return node
        behind = self.node(f"coupled {leg}")
        self.bypass(node, behind, "coupling")
        return behind

    def plus_input(self, node: Node) -> Node:
        """Return the amplifier's plus input with its coupling and bias resistor."""
        plus = self.couple(node)
        bias = self.optional("bias")
        if bias is not None:
            self.net.resistor(plus, GROUND, bias)
        return plus


def _follower(stage: _Stage, node: Node) -> None:
    minus = stage.out
    if stage.optional("feedback") is not None:
        minus = stage.node("minus")
        stage.feed_back(minus)
    stage.place_amplifier(stage.plus_input(node), minus)


def _non_inverting(stage: _Stage, node: Node) -> None:
    minus = stage.node("minus")
    stage.place_amplifier(stage.plus_input(node), minus)
    stage.feed_back(minus)
    shelved = stage.optional("ground_capacitor") is not None
    foot = stage.node("ground leg") if shelved else GROUND
    stage.net.resistor(minus, foot, stage.value("ground"))
    stage.bypass(foot, GROUND, "ground_capacitor")


def _inverting(stage: _Stage, node: Node) -> None:
    minus = stage.node("minus")
    stage.net.resistor(stage.couple(node), minus, stage.value("input"))
    stage.place_amplifier(GROUND, minus)
    stage.feed_back(minus)


def _summing(stage: _Stage, node: Node) -> None:
    minus = stage.node("minus")
    for leg in range(1, stage.kind.legs + 1):
        ohm = stage.value(f"inputs[{leg}]")
        if leg == stage.kind.driven:
            stage.net.resistor(stage.couple(node, leg), minus, ohm)
        elif stage.kind.grounded:
            ohm += stage.optional("undriven_source") or 0.0
            stage.net.resistor(stage.couple(GROUND, leg), minus, ohm)
    stage.place_amplifier(GROUND, minus)
    stage.feed_back(minus)


def _difference(stage: _Stage, node: Node) -> None:
    minus, plus = stage.node("minus"), stage.node("plus")
    at_plus, at_minus = _difference_inputs(stage, node)
    stage.net.resistor(at_plus, plus, stage.value("plus_input"))
    stage.net.resistor(plus, GROUND, stage.value("plus_ground"))
    stage.bypass(plus, GROUND, "plus_ground_capacitor")
    stage.net.resistor(at_minus, minus, stage.value("input"))
    stage.place_amplifier(plus, minus)
    stage.feed_back(minus)


def _difference_inputs(stage: _Stage, node: Node) -> tuple[Node, Node]:
    """Return what the plus and the minus leg hang on; both: half of the drive in opposite phase."""
    if stage.kind.driven == "plus":
        return node, GROUND
    if stage.kind.driven == "minus":
        return GROUND, node
    halves = stage.node("upper half"), stage.node("lower half")
    for half, ratio in zip(halves, (0.5, -0.5), strict=True):
        stage.net.transformer(half, of=node, ratio=ratio)
    return halves


def _open_loop(stage: _Stage, node: Node) -> None:
    stage.place_amplifier(node, GROUND)


def _divider(stage: _Stage, node: Node) -> None:
    stage.net.resistor(node, stage.out, stage.value("series"))
    shunt = stage.optional("shunt")
    if shunt is not None:
        stage.net.resistor(stage.out, GROUND, shunt)
    stage.bypass(stage.out, GROUND, "capacitor")


_WIRINGS: dict[str, Callable[[_Stage, Node], None]] = {
    "follower": _follower,
    "non-inverting": _non_inverting,
    "inverting": _inverting,
    "summing": _summing,
    "difference": _difference,
    "open-loop": _open_loop,
    "divider": _divider,
}
