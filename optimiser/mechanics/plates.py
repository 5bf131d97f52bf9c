"""A plate's stiffness between chosen radii, from its closed-form compliance.

The shape between the radii is the one of least bending energy, so that ring loads at the radii
are exact in linear theory; with more radii the stretched shape is approached as well.
"""

import numpy as np

from optimiser.compiled import kernel
from optimiser.mechanics.layout import Floats, Ints
from optimiser.mechanics.plate import ring_deflection, ring_moment, ring_slope


@kernel
def compliance(radii: Floats, clamp: float, edge: float, poisson: float) -> Floats:
    """Deflection at each of ``radii`` (n,) under 1 N on each ring, D = 1; (n, n), symmetric."""
    n = radii.size
    result = np.empty((n, n))
    for i in range(n):
        for j in range(i + 1):
            result[i, j] = ring_deflection(radii[i], radii[j], clamp, edge, poisson)
            result[j, i] = result[i, j]
    return result


@kernel
def slopes(points: Floats, radii: Floats, clamp: float, edge: float, poisson: float) -> Floats:
    """Slope at each of ``points`` (m,) under 1 N on each ring of ``radii`` (n,), D = 1; (m, n)."""
    result = np.empty((points.size, radii.size))
    for i in range(points.size):
        for j in range(radii.size):
            result[i, j] = ring_slope(points[i], radii[j], clamp, edge, poisson)
    return result


@kernel
def moments_at(points: Floats, radii: Floats, clamp: float, edge: float, poisson: float) -> Floats:
    """Radial moment at each of ``points`` (m,) under 1 N on each ring of ``radii`` (n,); (m, n)."""
    result = np.empty((points.size, radii.size))
    for i in range(points.size):
        for j in range(radii.size):
            result[i, j] = ring_moment(points[i], radii[j], clamp, edge, poisson)
    return result


@kernel
def factor(matrix: Floats, reach: Ints, size: int) -> bool:
    """Cholesky factor U (U'U = A) in place of the upper part.

    ``reach`` (size,) holds each row's last column that is not zero, and grows with the fill. Whole
    rows are updated, so that the loops run on vector units and still give the same digits anywhere.
    Returns False when the matrix is not positive definite.
    """
    for i in range(size):
        if matrix[i, i] <= 0.0:
            return False
        root = np.sqrt(matrix[i, i])
        stop = reach[i] + 1
        for j in range(i, stop):
            matrix[i, j] /= root
        for k in range(i + 1, stop):
            scale = matrix[i, k]
            if scale != 0.0:
                for j in range(reach[k] + 1, stop):
                    matrix[k, j] = 0.0
                reach[k] = max(reach[k], reach[i])
                for j in range(k, stop):
                    matrix[k, j] -= scale * matrix[i, j]
    return True


@kernel
def back_substitute(matrix: Floats, reach: Ints, size: int, vector: Floats) -> None:
    """Solve with the factor of :func:`factor`; ``vector`` (size,) becomes the solution."""
    for i in range(size):
        vector[i] /= matrix[i, i]
        value = vector[i]
        for j in range(i + 1, reach[i] + 1):
            vector[j] -= matrix[i, j] * value
    for i in range(size - 1, -1, -1):
        total = vector[i]
        for j in range(i + 1, reach[i] + 1):
            total -= matrix[i, j] * vector[j]
        vector[i] = total / matrix[i, i]


@kernel
def inverse(matrix: Floats) -> Floats:
    """Inverse of a small symmetric positive definite matrix (n, n)."""
    n = matrix.shape[0]
    upper = matrix.copy()
    reach = np.full(n, n - 1)
    factor(upper, reach, n)
    result = np.zeros((n, n))
    column = np.empty(n)
    for j in range(n):
        column[:] = 0.0
        column[j] = 1.0
        back_substitute(upper, reach, n, column)
        result[:, j] = column
    return result
