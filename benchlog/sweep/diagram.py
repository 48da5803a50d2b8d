"""The stepper's table drawn as text, for DEVELOPERS.md."""

from benchlog.sweep.table import MEASURING, TABLE, State, When

TOGETHER = "MEASURING"


def diagram_lines() -> list[str]:
    """Draw the table as a state diagram in Mermaid's notation, fenced for Markdown.

    Moves that every measuring state has in common are drawn once, from the box around them.

    Returns:
        Lines without line ends.
    """
    moves = [
        (state, target, _label(event.__name__, when, only=len(branches) == 1))
        for (state, event), branches in TABLE.items()
        for when, target in branches
    ]
    common = [
        (target, label)
        for state, target, label in moves
        if state is MEASURING[0] and all((other, target, label) in moves for other in MEASURING)
    ]
    own = [move for move in moves if move[0] not in MEASURING or move[1:] not in common]
    inside = [move for move in own if move[0] in MEASURING and move[1] in MEASURING]
    outside = [move for move in own if move not in inside]
    return [
        "```mermaid",
        "stateDiagram-v2",
        *(f"    {state.name}: {state.value}" for state in State),
        f"    [*] --> {State.PREPARING.name}",
        f"    state {TOGETHER} {{",
        *(f"        {_arrow(*move)}" for move in inside),
        "    }",
        *(f"    {TOGETHER} --> {target.name}: {label}" for target, label in common),
        *(f"    {_arrow(*move)}" for move in outside),
        f"    {State.ENDED.name} --> [*]",
        "```",
    ]


def _label(event: str, when: When, *, only: bool) -> str:
    if only:
        return event
    return f"{event} [{when.value or 'otherwise'}]"


def _arrow(state: State, target: State, label: str) -> str:
    return f"{state.name} --> {target.name}: {label}"
