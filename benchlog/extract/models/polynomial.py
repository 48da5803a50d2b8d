"""Straight equations for the coefficients of a polynomial in the square of frequency."""

import numpy as np

from benchlog.curve import FloatArray


def shared_row(array: FloatArray) -> FloatArray:
    """Return one row where all rows are the same memory, else the array as it is."""
    return array[:1] if array.strides[0] == 0 and len(array) > 1 else array


def weighted_polynomial(
    size: FloatArray, variable: FloatArray, weight: FloatArray, *, degree: int
) -> FloatArray:
    """Solve ``size (c0 + c1 v + ...) = 1`` by weighted least squares.

    Args:
        size: Shape (sweeps, points).
        variable: v, shape (sweeps, points) or (1, points) for all sweeps.
        weight: Shape (sweeps, points).
        degree: Of the polynomial.

    Returns:
        Coefficients, shape (sweeps, degree + 1); NaN where the equations have no solution.
    """
    weighted = weight * size
    powers = [np.ones_like(variable), variable]
    powers += [variable**power for power in range(2, 2 * degree + 1)]
    right = _sums(weighted, powers[: degree + 1])
    weighted *= size
    moments = _sums(weighted, powers)
    places = np.arange(degree + 1)
    with np.errstate(all="ignore"):
        scale = np.sqrt(moments[:, ::2])
        matrix = moments[:, places[:, None] + places] / scale[:, :, None] / scale[:, None, :]
        right = right / scale
        return np.asarray(_solved(matrix, right) / scale)


def _sums(weighted: FloatArray, powers: list[FloatArray]) -> FloatArray:
    """Return sums over points, shape (sweeps, powers)."""
    if len(powers[0]) == 1:
        return np.asarray(weighted @ np.concatenate(powers).T)
    return np.stack([np.einsum("sn,sn->s", weighted, power) for power in powers], axis=1)


def _solved(matrix: FloatArray, right: FloatArray) -> FloatArray:
    """Eliminate without looking for pivots, which symmetric positive matrices do not need."""
    size = matrix.shape[1]
    rows = [[matrix[:, one, other] for other in range(size)] for one in range(size)]
    values = [right[:, one] for one in range(size)]
    for pivot in range(size):
        for below in range(pivot + 1, size):
            factor = rows[below][pivot] / rows[pivot][pivot]
            for other in range(pivot + 1, size):
                rows[below][other] = rows[below][other] - factor * rows[pivot][other]
            values[below] = values[below] - factor * values[pivot]
    for pivot in reversed(range(size)):
        for known in range(pivot + 1, size):
            values[pivot] = values[pivot] - rows[pivot][known] * values[known]
        values[pivot] = values[pivot] / rows[pivot][pivot]
    return np.stack(values, axis=1)
