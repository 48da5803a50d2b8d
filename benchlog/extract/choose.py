"""Which shape the data support."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from benchlog.design.model import Design
from benchlog.errors import Misuse
from benchlog.extract.models.composed import Composed
from benchlog.extract.models.edge import Edge, HighPass, Shelf
from benchlog.extract.models.rolloff import EqualPoles, OnePole, Rolloff, TwoPole
from benchlog.extract.reduce import Data, Reduced, reduce_sweeps, refitted, wild_points
from benchlog.extract.validity import Fault

# A richer shape must be better by more than this in AICc: of curves that have the simpler shape
# some 1.4 % then get the richer one.
MARGIN = 4.0
# Weight of the chosen shape from which the others say nothing more.
_CERTAIN = 0.95
_MOST_POLES = 8
# What leaving out a point must gain in misfit; one five standard deviations out gains 25.
_PRICE_OF_A_POINT = 4.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Choice:
    """What was tried on many sweeps, and what was taken.

    Attributes:
        tried: Fits of each shape to the same points, simplest first.
        chosen: Place in ``tried``, shape (sweeps,).
        runner_up: Place of the next best shape that is still likely; -1 where there is none.
        wild: Points left out, shape (sweeps, points).
        weight: Of all points, those left out included, same shape.
        phase_left_out: Where phase was measured and not fitted, shape (sweeps,); None without it.
    """

    tried: tuple[Reduced, ...]
    chosen: npt.NDArray[np.int64]
    runner_up: npt.NDArray[np.int64]
    wild: npt.NDArray[np.bool_]
    weight: npt.NDArray[np.float64]
    phase_left_out: npt.NDArray[np.bool_] | None = None

    def comparable(self) -> tuple[Reduced, ...]:
        """Return the fits that were made as the first sweep's own was, with phase or without."""
        own = self.tried[int(self.chosen[0])].data.phase is None
        return tuple(one for one in self.tried if (one.data.phase is None) is own)

    def remarks(self) -> npt.NDArray[np.int64]:
        """Return the bits of what was left out, shape (sweeps,)."""
        bits = np.where(self.wild.any(axis=1), int(Fault.WILD_POINT), 0)
        if self.phase_left_out is not None:
            bits |= np.where(self.phase_left_out, int(Fault.PHASE_DISAGREES), 0)
        return bits


def shape_named(name: str) -> Composed:
    """Return a shape by its name.

    Args:
        name: ``"one-pole"``, ``"two-pole"`` or ``"3-equal-poles"``, alone or with
            ``"+lower-corner"`` or ``"+shelf"`` at its end.

    Raises:
        Misuse: There is no such shape.
    """
    upper, plus, lower = name.partition("+")
    edges: dict[str, Edge] = {"lower-corner": HighPass(), "shelf": Shelf()}
    rolloffs: dict[str, Rolloff] = {"one-pole": OnePole(), "two-pole": TwoPole()}
    rolloffs |= {f"{n}-equal-poles": EqualPoles(n) for n in range(2, _MOST_POLES + 1)}
    if upper not in rolloffs or (plus and lower not in edges):
        raise Misuse(f"there is no shape {name!r}")
    return Composed(rolloffs[upper], edges.get(lower))


def choose(data: Data, design: Design | None, *, shape: str) -> Choice:
    """Fit the shapes that come into question and take the one that the data support.

    Args:
        data: Sweeps.
        design: Tells how many equal stages there may be.
        shape: A shape's name, or ``"auto"``.
    """
    if shape != "auto":
        return _decided((shape_named(shape),), data)
    uppers: list[Rolloff] = [OnePole(), TwoPole()]
    stages = 0 if design is None else len(design.chain().figure_stages)
    if stages > 1:
        uppers.insert(1, EqualPoles(min(stages, _MOST_POLES)))
    simple = _decided(tuple(Composed(upper) for upper in uppers), data)
    if not _all_poor(simple).any():
        return simple
    if design is None:
        # Two equal poles are two poles with a Q of a half; more of them nothing else explains.
        uppers += [EqualPoles(3), EqualPoles(4)]
    edges: tuple[Edge | None, ...] = (None, HighPass(), Shelf())
    shapes = [Composed(upper, edge) for edge in edges for upper in uppers]
    shapes.sort(key=lambda one: len(one.parameters))
    return _decided(tuple(shapes), data)


def _all_poor(choice: Choice) -> npt.NDArray[np.bool_]:
    """Tell the sweeps that the chosen shape does not explain, or that begin below a plateau."""
    columns = np.arange(len(choice.chosen))
    faults = np.stack([one.faults for one in choice.tried])[choice.chosen, columns]
    unexplained = Fault.POOR_FIT | Fault.PLATEAU_NOT_REACHED | Fault.NOT_CONVERGED
    poor: npt.NDArray[np.bool_] = (faults & int(unexplained)) != 0
    return poor


def _decided(shapes: tuple[Composed, ...], data: Data) -> Choice:
    """Fit, leave wild points out, fit again, and with the phase where it agrees."""
    by_magnitude = replace(data, phase=None)
    fits = [reduce_sweeps(shape, by_magnitude) for shape in shapes]
    wild = _wild(fits, by_magnitude)
    rows = np.flatnonzero(wild.any(axis=1))
    if rows.size:
        fits = [refitted(fit, by_magnitude.without(wild), rows) for fit in fits]
    chosen, runner_up = _best(fits)
    if data.phase is None:
        return Choice(
            tried=tuple(fits), chosen=chosen, runner_up=runner_up, wild=wild, weight=data.weight
        )
    with_phase = [reduce_sweeps(shape, data.without(wild)) for shape in shapes]
    first, second = _best(with_phase)
    columns = np.arange(len(first))
    faults = np.stack([fit.faults for fit in with_phase])[first, columns]
    alone = (faults & int(Fault.PHASE_DISAGREES)) != 0
    aside = len(shapes)
    return Choice(
        tried=(*with_phase, *fits),
        chosen=np.where(alone, chosen + aside, first),
        runner_up=np.where(alone, np.where(runner_up < 0, -1, runner_up + aside), second),
        wild=wild,
        weight=data.weight,
        phase_left_out=alone,
    )


def _wild(fits: Sequence[Reduced], data: Data) -> npt.NDArray[np.bool_]:
    """Return the wild points as the shape sees them that explains the rest best.

    A shape too simple takes its own misfit for scatter and overlooks a wild point; one too rich
    bends to meet a wild point at the end of the sweep.
    """
    found = [wild_points(fit) for fit in fits]
    if not any(wild.any() for wild, _ in found):
        return found[0][0]
    scores = []
    for fit, (wild, chi2) in zip(fits, found, strict=True):
        left_out = wild.sum(axis=1)
        kept = np.maximum(fit.fit.count - left_out, 1)
        misfit = chi2 if data.stated else kept * np.log(np.maximum(chi2 / kept, 1e-24))
        price = 2.0 * len(fit.shape.parameters) + _PRICE_OF_A_POINT * left_out
        scores.append(np.where(np.isfinite(fit.fit.chi2), misfit + price, np.inf))
    best = np.argmin(scores, axis=0)
    chosen: npt.NDArray[np.bool_] = np.stack([wild for wild, _ in found])[
        best, np.arange(len(best))
    ]
    return chosen


def _best(fits: Sequence[Reduced]) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.int64]]:
    """Return the simplest shape within the margin of the best, and what comes next."""
    aicc = np.stack([fit.aicc for fit in fits])
    columns = np.arange(aicc.shape[1])
    best = aicc.min(axis=0)
    near = aicc <= best + MARGIN
    none = ~np.isfinite(best)
    chosen = np.where(none, 0, near.argmax(axis=0))
    with np.errstate(invalid="ignore"):
        likelihood = np.where(np.isfinite(aicc), np.exp(-0.5 * (aicc - best)), 0.0)
    share = likelihood / np.maximum(likelihood.sum(axis=0), 1e-300)
    certain = share[chosen, columns] >= _CERTAIN
    others = aicc.copy()
    others[chosen, columns] = np.inf
    next_best = others.argmin(axis=0)
    alone = certain | none | ~np.isfinite(others[next_best, columns])
    return chosen, np.where(alone, -1, next_best)
