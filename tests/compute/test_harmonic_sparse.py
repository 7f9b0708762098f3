"""A large machine on its lowest modes with static correction, against a sparse direct solver."""

from typing import Any

import numpy as np
import pytest
from scipy.sparse import csc_array, diags_array, eye_array, kron
from scipy.sparse.linalg import spsolve

from service.compute.constraints import Ties
from service.compute.couplings import couplings_of_sparse, touched_by
from service.compute.damped_system import Damping
from service.compute.harmonic import Load, responder
from service.compute.normal_coordinates import diagonal_machine
from service.compute.real_modes import Wanted
from service.compute.reduced import REACH, reduced
from service.compute.sparse_modes import SparsePencil, sparse_modes

Sparse = csc_array[Any]
SEEN = [37, 411, 700]


def plate(held: float) -> tuple[Sparse, Sparse]:
    """A lattice of 40 × 20 points, free or held by weak springs."""

    def line(n: int) -> Any:
        ends = np.full(n, 2.0)
        ends[[0, -1]] = 1.0
        return diags_array([np.full(n - 1, -1.0), ends, np.full(n - 1, -1.0)], offsets=[-1, 0, 1])

    K = kron(line(40), eye_array(20)) + kron(eye_array(40), line(20)) + held * eye_array(800)
    mass = np.random.default_rng(3).uniform(0.5, 1.5, 800)
    return csc_array(1e5 * K), csc_array(diags_array(mass))


@pytest.mark.parametrize("held", [1e-3, 0.0])
def test_few_modes_with_correction_agree_with_a_direct_solution(held: float) -> None:
    K, M = plate(held)
    rows = np.zeros((3, 800))
    rows[[0, 1, 2, 2], [5, 300, 620, 621]] = [1.0, 1.0, 1.0, -1.0]
    local = csc_array(rows.T @ (np.array([[20.0], [50.0], [9.0]]) * rows))
    omega = np.linspace(3.0, 60.0, 9)
    top = float(omega[-1])
    pencil = SparsePencil(
        K, M, None, tuple(map(str, range(800))), Ties(None, np.arange(800), (), ())
    )
    modes = sparse_modes(pencil, Wanted(limit=(REACH * top) ** 2))
    assert modes.complete
    assert len(modes.values) < 40
    none = csc_array((800, 800))
    damping = Damping(local, none, none, beta=2e-4)
    places = np.unique(np.concatenate([SEEN, touched_by(local)]))
    found = reduced(pencil, modes, np.eye(800)[:, places], top)
    parts = (found.B, found.mass, found.stiffness, found.rigid)
    couplings = couplings_of_sparse(damping, found.B, 0.0)
    own = diagonal_machine(parts, len(modes.values), damping, couplings)
    load = Load((0,), found.B[SEEN[:1]].astype(complex))
    still = np.zeros(len(omega))
    q = responder(own, len(omega), still).coordinates(load, omega, still)
    f = np.zeros(800, dtype=complex)
    f[SEEN[0]] = 1.0
    for w, row in zip(omega, q @ found.B[SEEN].T, strict=True):
        expected = spsolve(csc_array(K + 1j * w * (local + 2e-4 * K) - w * w * M), f)[SEEN]
        assert np.abs(row - expected).max() < 1e-7 * np.abs(expected).max()
