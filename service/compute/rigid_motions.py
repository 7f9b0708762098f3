"""Motions that strain no connection, found from the geometry and not from the stiffnesses."""

import numpy as np

from service.compute.machine import Floats
from service.compute.pencil import EPS, Pencil

FLAT = 1e-11  # of the largest singular value of J with rows and columns of length 1


def rigid_motions(pencil: Pencil) -> Floats:
    """(r, f) M-orthonormal basis of the null space of K.

    With deformation rows known, of J, each row and column scaled to length 1: how stiff a
    connection is has no say. Of explicit matrices, of K scaled to a unit diagonal.
    """
    null: Floats = _of_rows(pencil.J) if pencil.J is not None else _of_stiffness(pencil.K)
    if not null.shape[1]:
        return null[: pencil.size]
    if pencil.carry is None:
        return _orthonormal(null, pencil)
    carried = np.asarray(np.linalg.solve(pencil.M, pencil.carry @ null), dtype=float)
    return _orthonormal(carried, pencil)


def _of_rows(J: Floats) -> Floats:
    rows: Floats = np.linalg.norm(J, axis=1)
    if not rows.any():
        return np.eye(J.shape[1])
    J = J[rows > 0.0] / rows[rows > 0.0, None]
    columns: Floats = np.linalg.norm(J, axis=0)
    columns = np.where(columns > 0.0, columns, 1.0)
    triangle = np.linalg.qr(J / columns, mode="r")
    _, values, vectors = np.linalg.svd(triangle, full_matrices=True)
    rank = int(np.count_nonzero(values > FLAT * values[0]))
    null: Floats = vectors[rank:].T / columns[:, None]
    return null


def _of_stiffness(K: Floats) -> Floats:
    diagonal = np.abs(K.diagonal())
    scale = np.where(diagonal > 0.0, 1.0 / np.sqrt(np.where(diagonal > 0.0, diagonal, 1.0)), 1.0)
    values, vectors = np.linalg.eigh(K * scale[:, None] * scale)
    null = np.abs(values) <= 8 * len(K) * EPS * max(1.0, float(np.abs(values).max()))
    motions: Floats = scale[:, None] * vectors[:, null]
    return motions


def _orthonormal(null: Floats, pencil: Pencil) -> Floats:
    """In the inner product of M, by two rounds of Cholesky QR with the factor L."""
    Q, _ = np.linalg.qr(pencil.L.T @ null)
    back: Floats = np.linalg.solve(pencil.L.T, Q)
    return back
