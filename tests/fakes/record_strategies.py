"""Hypothesis strategies for the records that a logbook keeps."""

import json
import math
from datetime import UTC
from typing import Any

from hypothesis import strategies as st

from benchlog.records import (
    FIGURE_NAMES,
    VERDICT_ORDER,
    Figure,
    Figures,
    InstrumentUsed,
    LineVerdict,
    Point,
    PointFlag,
    Reason,
    SweepStart,
    Term,
    TermShare,
    Verdict,
)

words = st.text(max_size=12)
finite = st.floats(allow_nan=False, allow_infinity=False)
positive = st.floats(min_value=0, exclude_min=True, allow_nan=False, allow_infinity=False)
not_negative = st.floats(min_value=0, allow_nan=False, allow_infinity=False)
dofs = st.one_of(st.just(math.inf), positive)
bounds = st.sampled_from(["at least", "at most"])
rules = st.sampled_from(["simple", "guarded", "four-state", "guarded-rejection"])
figure_names = st.sampled_from(FIGURE_NAMES)


def maybe(strategy: st.SearchStrategy[Any]) -> st.SearchStrategy[Any]:
    """Return the strategy, or None."""
    return st.one_of(st.none(), strategy)


def tuples_of(strategy: st.SearchStrategy[Any]) -> st.SearchStrategy[tuple[Any, ...]]:
    """Return short tuples."""
    return st.lists(strategy, max_size=3).map(tuple)


terms = st.builds(
    Term,
    name=words,
    kind=st.sampled_from(["scale", "flatness", "reading"]),
    u_rel=not_negative,
    band_hz=maybe(st.tuples(positive, positive)),
    dof=dofs,
    source=words,
)

instruments = st.builds(
    InstrumentUsed,
    role=st.sampled_from(["source", "input meter", "output meter", "scope"]),
    identity=words,
    address=words,
    driver=words,
    calibration_due=maybe(words),
)

starts = st.builds(
    SweepStart,
    uuid=st.uuids(version=4).map(str),
    serial=st.text(min_size=1, max_size=12),
    kind=st.sampled_from(["sweep", "capture", "through"]),
    started_at=st.datetimes(timezones=st.just(UTC)).map(lambda moment: moment.isoformat()),
    design_sha256=st.none(),
    reference=st.sampled_from(["input", "through", "programmed"]),
    source_ohm=maybe(not_negative),
    simulated=st.booleans(),
    operator=words,
    lot=words,
    reason=words,
    note=words,
    settings=st.dictionaries(words, words, max_size=2).map(json.dumps),
    capture_sha256=maybe(st.just("ab" * 32)),
    instruments=tuples_of(instruments),
    terms=tuples_of(terms),
)


def points_at(position: int) -> st.SearchStrategy[Point]:
    """Return points of one position."""
    return st.builds(
        Point,
        position=st.just(position),
        frequency_hz=positive,
        level_vrms=not_negative,
        input_vrms=maybe(not_negative),
        output_vrms=maybe(not_negative),
        gain=maybe(not_negative),
        u_gain_rel=maybe(not_negative),
        phase_deg=maybe(finite),
        flags=st.integers(0, 31).map(PointFlag),
        kind=st.just("point"),
        attempts=st.integers(1, 5),
        raw=maybe(words),
    )


point_lists = st.integers(0, 4).flatmap(
    lambda count: st.tuples(*(points_at(position) for position in range(count)))
)

shares = st.builds(
    TermShare, name=words, u=not_negative, dof=dofs, kind=st.sampled_from(["A", "B"])
)

figure = st.builds(
    Figure,
    value=finite,
    unit=words,
    u=maybe(not_negative),
    dof=dofs,
    k=positive,
    bound=maybe(bounds),
    terms=tuples_of(shares),
)

reasons = st.builds(Reason, code=words, text=words, figures=tuples_of(figure_names))

figure_sets = st.builds(
    Figures,
    **{name: maybe(figure) for name in FIGURE_NAMES},
    shape=words,
    validity=tuples_of(reasons),
    gbw_basis=maybe(st.sampled_from(["design", "signal gain"])),
    limited_by=maybe(words),
    shapes_tried=tuples_of(st.tuples(words, st.floats(allow_nan=False))),
    chosen_because=words,
    method=words,
    left_out=tuples_of(st.integers(0, 1000)),
)

line_verdicts = st.builds(
    LineVerdict,
    figure=figure_names,
    minimum=maybe(finite),
    maximum=maybe(finite),
    unit=words,
    value=maybe(finite),
    u=maybe(not_negative),
    U=maybe(not_negative),
    k=maybe(positive),
    dof=maybe(dofs),
    conformance_probability=maybe(st.floats(0, 1)),
    verdict=st.sampled_from(VERDICT_ORDER),
    rule=rules,
    guard=not_negative,
    basis=maybe(st.sampled_from(["figure", "bound"])),
    reason=words,
)

verdicts = st.builds(
    Verdict, overall=st.sampled_from(VERDICT_ORDER), lines=tuples_of(line_verdicts)
)
