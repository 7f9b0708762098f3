"""The damping, gyroscopic terms and stiffness of a posted system, in all its motions."""

import numpy as np

from schemas.faults import Fault, Invalid
from schemas.system import AnySystem, MatricesSystem, ModalDamping, RayleighDamping
from service.compute.damped_system import Damping
from service.compute.machine import Floats
from service.compute.pencil import rows_at
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
        return _of_matrices(system)
    assembly = analysed.assembly
    assert assembly is not None
    J, none = assembly.J, np.zeros_like(analysed.M)
    ratio, alpha, beta = 0.0, 0.0, 0.0
    if isinstance(system.damping, ModalDamping):
        ratio = system.damping.ratio
    elif isinstance(system.damping, RayleighDamping):
        alpha, beta = system.damping.alpha, system.damping.beta
    return Damping(
        C=J.T @ (assembly.c[:, None] * J),
        H=J.T @ (assembly.h[:, None] * J),
        G=none if assembly.G is None else assembly.G,
        bearings=assembly.bearings,
        ratio=ratio,
        alpha=alpha,
        beta=beta,
    )


def _of_matrices(system: MatricesSystem) -> Damping:
    faults: list[Fault] = []
    size = len(system.degrees_of_freedom)
    found = {}
    for field in ("damping", "structural", "gyroscopic"):
        posted = getattr(system, field)
        matrix = None if posted is None else matrix_of(posted, field, size, faults)
        found[field] = np.zeros((size, size)) if matrix is None else dense(matrix)
    G = found["gyroscopic"]
    if np.abs(G + G.T).max() > 1e-9 * max(float(np.abs(G).max()), 1e-300):
        faults.append(Fault("/gyroscopic", "not skew-symmetric"))
    if faults:
        raise Invalid(faults)
    return Damping(found["damping"], found["structural"], G)


def stiffness_of(system: AnySystem, analysed: Analysed, rpm: float) -> Floats:
    """(n, n) symmetric stiffness in all motions, bearings as they are at `rpm`."""
    if isinstance(system, MatricesSystem):
        return analysed.pencil.K if analysed.pencil.R is None else _posted_stiffness(system)
    assert analysed.assembly is not None
    J, k = rows_at(analysed.assembly, rpm)
    K: Floats = J.T @ (k[:, None] * J)
    return K


def _posted_stiffness(system: MatricesSystem) -> Floats:
    posted = matrix_of(system.stiffness, "stiffness", len(system.degrees_of_freedom), [])
    assert posted is not None
    K = dense(posted)
    return (K + K.T) / 2


def speed_matters(damping: Damping) -> bool:
    """Whether the modes change with the speed of the shaft."""
    return bool(damping.G.any()) or any(len(b.rpm) > 1 for b, _ in damping.bearings)
