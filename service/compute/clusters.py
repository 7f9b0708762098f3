"""One basis, always the same, for the shapes of a repeated root.

Any basis of the space that belongs to a repeated root is as good as another, and which one a
library returns depends on its threads and its processor. Here the first shape is the one that moves
most where the space moves most, the next one the same among what is left, and so on (a pivoted
Cholesky factorization of the projector on the space).
"""

from itertools import pairwise

import numpy as np

from service.compute.machine import Floats

SAME = 1e-13  # relative: eigenvalues that differ by less are one root; mixing them costs no digits
TIE = 1e-6  # lengths that differ by less are taken for equal, so that roundoff decides nothing


def settle(values: Floats, shapes: Floats, weight: Floats, slack: Floats) -> Floats:
    """The (r, m) mass-normalized shapes with a settled basis in every cluster and settled signs.

    Parameters
    ----------
    values : (m,) eigenvalues, ascending
    weight : (r,) square roots of the diagonal of M, to compare motions of different kind
    slack : (m,) how far each eigenvalue may be off
    """
    settled = shapes.copy()
    for first, last in clusters(values, slack):
        settled[:, first:last] = _settled_basis(shapes[:, first:last], weight)
    return settled * _signs(settled * weight[:, None])


def settle_space(shapes: Floats, weight: Floats) -> Floats:
    """The same for (r, c) shapes that all belong to one root."""
    if not shapes.shape[1]:
        return shapes
    settled = _settled_basis(shapes, weight)
    return settled * _signs(settled * weight[:, None])


def clusters(values: Floats, slack: Floats) -> list[tuple[int, int]]:
    """First and one past the last place of each repeated root."""
    if len(values) < 2:
        return []
    close = np.diff(values) <= np.maximum(SAME * np.abs(values[1:]), 2 * (slack[1:] + slack[:-1]))
    if not close.any():
        return []
    edges = [0, *(np.flatnonzero(~close) + 1).tolist(), len(values)]
    return [(a, b) for a, b in pairwise(edges) if b - a > 1]


def _settled_basis(V: Floats, weight: Floats) -> Floats:
    """Rotate V (r, c): its columns stay orthonormal."""
    rotation = np.zeros((V.shape[1], 0))
    left = V * weight[:, None]
    for _ in range(V.shape[1]):
        lengths = np.linalg.norm(left, axis=1)
        most = int(np.flatnonzero(lengths >= (1 - TIE) * lengths.max())[0])
        direction = left[most] / lengths[most]
        direction -= rotation @ (rotation.T @ direction)
        direction /= np.linalg.norm(direction)
        rotation = np.column_stack([rotation, direction])
        left = left - np.outer(left @ direction, direction)
    return V @ rotation


def _signs(shapes: Floats) -> Floats:
    """(m,) signs that make the largest entry of each shape positive (the first of equals)."""
    size = np.abs(shapes)
    first = (size >= (1 - TIE) * size.max(axis=0)).argmax(axis=0)
    return np.where(shapes[first, np.arange(shapes.shape[1])] < 0.0, -1.0, 1.0)
