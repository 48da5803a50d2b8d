"""From scatter and type B terms to the uncertainty of each parameter and figure.

Every cause is carried as what it does to the vector of fitted parameters; figures are functions
of that vector, so that correlations are in everything that follows.

Source:
    JCGM 100:2008, 5.2 (correlated inputs), G.4 (effective degrees of freedom).
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from scipy.special import stdtrit

from benchlog.curve import FloatArray
from benchlog.extract.solve import Fit
from benchlog.records import Bound, Figure, Term, TermShare

# 95.45 % two-sided, the level that makes k = 2 for the normal distribution (JCGM 100, 6.3.3).
_UPPER_TAIL = 0.977249868051821
SCATTER = "scatter of the readings"
PARTS = "tolerance of the parts"


@dataclass(frozen=True, slots=True, kw_only=True)
class Cause:
    """One independent cause of uncertainty, as its covariance over the fitted parameters.

    Attributes:
        name, kind: For the term table.
        covariance: Shape (parameters, parameters).
        dof: Degrees of freedom.
    """

    name: str
    kind: Literal["A", "B"]
    covariance: FloatArray
    dof: float

    def share(self, sensitivity: FloatArray) -> float:
        """Return the standard uncertainty of a function of the parameters from this cause."""
        return math.sqrt(max(0.0, float(sensitivity @ self.covariance @ sensitivity)))


def coverage_factor(dof: float) -> float:
    """Return k for 95.45 % (JCGM 100, G.3.4): Student's t, 2 for infinite dof."""
    return 2.0 if math.isinf(dof) else float(stdtrit(dof, _UPPER_TAIL))


def effective_dof(shares: Sequence[TermShare]) -> float:
    """Return the degrees of freedom of a sum of independent terms (Welch-Satterthwaite, G.4.1)."""
    total = sum(share.u**2 for share in shares) ** 2
    spread = sum(share.u**4 / share.dof for share in shares)
    if len(shares) == 1:
        return shares[0].dof
    return total / spread if spread > 0 else math.inf


def figure(
    value: float, unit: str, shares: Sequence[TermShare], *, bound: Bound | None = None
) -> Figure:
    """Make a figure from its term table."""
    present = tuple(share for share in shares if share.u > 0)
    dof = effective_dof(present)
    return Figure(
        value=value,
        unit=unit,
        u=math.sqrt(sum(share.u**2 for share in present)),
        dof=dof,
        k=coverage_factor(dof),
        bound=bound,
        terms=present,
    )


def shares_of(causes: Sequence[Cause], sensitivity: FloatArray, *, scale: float) -> list[TermShare]:
    """Return the term table of a function of the parameters.

    Args:
        causes: Independent causes.
        sensitivity: Derivative of the function's logarithm by each parameter.
        scale: What makes a relative uncertainty one in the figure's unit: its value.
    """
    return [
        TermShare(
            name=cause.name, u=scale * cause.share(sensitivity), dof=cause.dof, kind=cause.kind
        )
        for cause in causes
    ]


def scatter_cause(fit: Fit, *, stated: bool) -> Cause:
    """Return type A: from the stated noise of the points, or from the residuals where none is.

    Args:
        fit: Of one sweep; its weights are inverse variances where the noise is stated, else 1.
        stated: Whether the noise is stated.
    """
    inverse = fit.inverse_normal[0]
    if stated:
        return Cause(name=SCATTER, kind="A", covariance=inverse, dof=math.inf)
    dof = float(fit.count[0] - inverse.shape[0])
    return Cause(name=SCATTER, kind="A", covariance=inverse * float(fit.chi2[0]) / dof, dof=dof)


def term_causes(
    terms: Sequence[Term], fit: Fit, *, frequency_hz: FloatArray, weight: FloatArray
) -> list[Cause]:
    """Return type B terms as causes.

    A scale term moves all points together, a flatness term those of its band together, a reading
    term every point on its own; each goes through the same weighted fit as the points.

    Args:
        terms: Of the curve.
        fit: Of one sweep, with derivatives of shape (1, points, parameters).
        frequency_hz: Shape (points,).
        weight: As fitted, shape (points,).
    """
    to_parameters = fit.inverse_normal[0] @ (fit.derivatives[0] * weight[:, None]).T
    causes = []
    for term in terms:
        moved = np.full(frequency_hz.size, term.u_rel)
        if term.band_hz is not None:
            low, high = term.band_hz
            moved = moved * ((frequency_hz >= low) & (frequency_hz <= high))
        if term.kind == "reading":
            spread = to_parameters * moved
            covariance = spread @ spread.T
        else:
            shift = to_parameters @ moved
            covariance = np.outer(shift, shift)
        causes.append(Cause(name=term.name, kind="B", covariance=covariance, dof=term.dof))
    return causes


def design_causes(  # noqa: PLR0913 - what one fit with priors was made of
    terms: Sequence[Term],
    fit: Fit,
    *,
    parameters: Sequence[str],
    prior_weight: FloatArray,
    frequency_hz: FloatArray,
    weight: FloatArray,
    dof: float,
) -> list[Cause]:
    """Return the causes of a fit with priors; their covariances add up to that of the fit.

    Args:
        terms: Of the curve; its scale terms are the prior of ``ln_scale``.
        fit: Of one sweep.
        parameters: Their names.
        prior_weight: Inverse variances of what was known beforehand.
        frequency_hz: Shape (points,).
        weight: Inverse variances, shape (points,).
        dof: Of the scatter.
    """
    covariance, derivatives = fit.inverse_normal[0], fit.derivatives[0]
    information = (derivatives * weight[:, None]).T @ derivatives
    scatter = covariance @ information @ covariance
    causes = [Cause(name=SCATTER, kind="A", covariance=scatter, dof=dof)]
    scale = np.array([name == "ln_scale" for name in parameters])
    for name, which in ((PARTS, ~scale), ("scale of the readings", scale)):
        known = covariance @ np.diag(np.where(which, prior_weight, 0.0)) @ covariance
        causes.append(Cause(name=name, kind="B", covariance=known, dof=math.inf))
    others = [term for term in terms if term.kind != "scale"]
    return causes + term_causes(others, fit, frequency_hz=frequency_hz, weight=weight)
