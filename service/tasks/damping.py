"""The damping, gyroscopic terms and stiffness of a posted system, in all its motions."""

import numpy as np
from scipy.sparse import csc_array, diags_array

from schemas.faults import Fault, Invalid
from schemas.system import AnySystem, MatricesSystem, ModalDamping, RayleighDamping
from service.compute.assembly import Matrix
from service.compute.damped_system import Damping, has_entries
from service.compute.machine import Floats
from service.compute.pencil import rows_at
from service.compute.sparse_modes import SparsePencil
from service.tasks.machines import Analysed
from service.tasks.matrices import dense, matrix_of


def damping_of(system: AnySystem, analysed: Analysed) -> Damping:
    """What damps and turns the system.

    Raises
    ------
    Invalid
        A posted matrix is wrong; pointers start at the system.
    """
    if isinstance(system, MatricesSystem):
        return _of_matrices(system, analysed)
    assembly = analysed.assembly
    assert assembly is not None
    J, none = assembly.J, 0.0 * analysed.M
    ratio, alpha, beta = 0.0, 0.0, 0.0
    if isinstance(system.damping, ModalDamping):
        ratio = system.damping.ratio
    elif isinstance(system.damping, RayleighDamping):
        alpha, beta = system.damping.alpha, system.damping.beta
    return Damping(
        C=weighed(J, assembly.c),
        H=weighed(J, assembly.h),
        G=none if assembly.G is None else assembly.G,
        bearings=assembly.bearings,
        ratio=ratio,
        alpha=alpha,
        beta=beta,
    )


def weighed(J: Matrix, k: Floats) -> Matrix:
    """Jᵀ diag(k) J, dense or sparse as J is."""
    if isinstance(J, np.ndarray):
        return J.T @ (k[:, None] * J)
    return J.T @ diags_array(k) @ J


def _of_matrices(system: MatricesSystem, analysed: Analysed) -> Damping:
    faults: list[Fault] = []
    size = len(system.degrees_of_freedom)
    found = {}
    for field in ("damping", "structural", "gyroscopic"):
        posted = getattr(system, field)
        matrix = None if posted is None else matrix_of(posted, field, size, faults)
        found[field] = csc_array((size, size)) if matrix is None else matrix
    G = found["gyroscopic"]
    if abs(G + G.T).max() > 1e-9 * max(float(abs(G).max()), 1e-300):
        faults.append(Fault("/gyroscopic", "not skew-symmetric"))
    if faults:
        raise Invalid(faults)
    if isinstance(analysed.pencil, SparsePencil):
        return Damping(found["damping"], found["structural"], G)
    return Damping(dense(found["damping"]), dense(found["structural"]), dense(G))


def stiffness_of(system: AnySystem, analysed: Analysed, rpm: float) -> Matrix:
    """(n, n) symmetric stiffness in all motions, bearings as they are at `rpm`."""
    if isinstance(system, MatricesSystem):
        return analysed.pencil.K if analysed.pencil.R is None else _posted_stiffness(system)
    assert analysed.assembly is not None
    return weighed(*rows_at(analysed.assembly, rpm))


def _posted_stiffness(system: MatricesSystem) -> Floats:
    posted = matrix_of(system.stiffness, "stiffness", len(system.degrees_of_freedom), [])
    assert posted is not None
    K = dense(posted)
    return (K + K.T) / 2


def speed_matters(damping: Damping) -> bool:
    """Whether the modes change with the speed of the shaft."""
    return has_entries(damping.G) or any(len(b.rpm) > 1 for b, _ in damping.bearings)


def is_damped(damping: Damping) -> bool:
    """Whether anything takes energy out."""
    assumed = damping.ratio > 0.0 or damping.alpha > 0.0 or damping.beta > 0.0
    acting = has_entries(damping.C) or has_entries(damping.H)
    return assumed or acting or any(b.damping.any() for b, _ in damping.bearings)
