"""What a machine adds to K − λM when it is damped and turns, and its roots at a speed."""

from dataclasses import dataclass
from math import pi

import numpy as np

from service.compute.assembly import Matrix
from service.compute.damped_modes import Complexes, Roots, damped_roots, first_order_roots
from service.compute.machine import Bearing, Floats
from service.compute.pencil import Pencil
from service.compute.real_modes import Modes
from service.compute.solve import AnyPencil

NOTHING = 1e-14  # of the largest entry: damping below this on a massless motion is none


@dataclass(frozen=True, slots=True)
class Damping:
    """Damping and gyroscopic terms in all n motions.

    Attributes
    ----------
    C : (n, n) viscous damping, N·s/m
    H : (n, n) imaginary part of the stiffness, N/m
    G : (n, n) gyroscopic matrix per rad/s of shaft speed, kg
    bearings : bearings with their (2, n) deformation rows
    ratio : damping ratio of every mode
    alpha, beta : C = αM + βK besides, 1/s and s
    """

    C: Matrix
    H: Matrix
    G: Matrix
    bearings: tuple[tuple[Bearing, Matrix], ...] = ()
    ratio: float = 0.0
    alpha: float = 0.0
    beta: float = 0.0

    def without_dissipation(self) -> "Damping":
        """The gyroscopic terms and the bearings' stiffness alone."""
        bearings = tuple((bearing.elastic(), rows) for bearing, rows in self.bearings)
        return Damping(0.0 * self.C, 0.0 * self.H, self.G, bearings)

    def viscous(self, rpm: float) -> Matrix:
        """C + ωG with the bearings at `rpm`."""
        C = self.C + (rpm * pi / 30.0) * self.G
        for bearing, rows in self.bearings:
            C = C + rows.T @ bearing.coefficients(rpm)[1] @ rows
        return C

    def circulatory(self, rpm: float) -> Matrix:
        """The skew-symmetric part of the bearings' stiffness at `rpm`."""
        S = 0.0 * self.C
        for bearing, rows in self.bearings:
            K = bearing.coefficients(rpm)[0]
            S = S + rows.T @ ((K - K.T) / 2) @ rows
        return S


@dataclass(frozen=True, slots=True)
class DampedModes:
    """Damped modes of a machine at one speed, sorted by |λ|.

    Attributes
    ----------
    values : (m,) roots, 1/s
    shapes : (n, m) in all motions, φᴴMφ = 1, largest entry real and positive
    conditions, bounds : (m,) condition of each root, and how far it may be off, 1/s
    residual : the largest relative residual of the full quadratic problem
    method : how it was done
    """

    values: Complexes
    shapes: Complexes
    conditions: Floats
    bounds: Floats
    residual: float
    method: str


def has_entries(A: Matrix) -> bool:
    """Whether any entry of a dense or sparse matrix isn't zero."""
    return bool(A.any()) if isinstance(A, np.ndarray) else bool(np.any(A.data))


def modal_terms(
    damping: Damping, modes: Modes, shapes: Floats, rpm: float
) -> tuple[Floats, Floats | Complexes]:
    """D and S of the quadratic problem in the coordinates of undamped modes.

    Parameters
    ----------
    shapes : (n, r) mass-normalized undamped shapes in all motions
    """
    omega = np.sqrt(np.maximum(modes.values, 0.0))
    D = shapes.T @ damping.viscous(rpm) @ shapes
    D = D + np.diag(2 * damping.ratio * omega + damping.alpha + damping.beta * modes.values)
    S = shapes.T @ damping.circulatory(rpm) @ shapes
    if has_entries(damping.H):
        return D, S + 1j * (shapes.T @ damping.H @ shapes)
    return D, S


def damped_modes(
    pencil: AnyPencil, modes: Modes, damping: Damping, M: Matrix, K: Matrix, rpm: float
) -> DampedModes:
    """The damped modes of a machine at `rpm`.

    Parameters
    ----------
    pencil, modes : the undamped problem at that speed, and its modes (all, or the lowest ones on
        which a large problem is projected)
    M, K : (n, n) mass, and the symmetric stiffness at that speed, in all motions
    """
    shapes = pencil.full(modes.shapes)
    C = damping.viscous(rpm) + damping.alpha * M + damping.beta * K
    stiffness = K + damping.circulatory(rpm) + 1j * damping.H
    if isinstance(pencil, Pencil) and _acts_on_massless(pencil, C, damping):
        roots = first_order_roots(pencil, M, C, stiffness)
        found: Complexes = pencil.tied(roots.shapes)
    else:
        roots = damped_roots(modes.values, *modal_terms(damping, modes, shapes, rpm))
        found = shapes @ roots.shapes
        if damping.ratio:
            C = C + _modal_damping(damping.ratio, modes, shapes, M)
    return _normalized(roots, found, pencil, M, C, stiffness)


def _modal_damping(ratio: float, modes: Modes, shapes: Floats, M: Floats) -> Floats:
    """MΦ·diag(2ζω)·ΦᵀM: the matrix that gives every mode the ratio ζ."""
    pushed = M @ shapes
    matrix: Floats = (pushed * (2 * ratio * np.sqrt(np.maximum(modes.values, 0.0)))) @ pushed.T
    return matrix


def _acts_on_massless(pencil: Pencil, C: Floats, damping: Damping) -> bool:
    """Whether a massless motion is damped, so that it can't be condensed with stiffness alone."""
    if pencil.empty is None:
        return False
    empty = pencil.tied(pencil.empty)
    return any(
        bool(np.abs(A @ empty).max(initial=0.0) > NOTHING * max(float(np.abs(A).max()), 1e-300))
        for A in (C, damping.H)
    )


def _normalized(
    roots: Roots, shapes: Complexes, pencil: AnyPencil, M: Matrix, C: Matrix, K: Matrix
) -> DampedModes:
    """Scale and turn the shapes, then take the residual of the full problem."""
    weight = np.sqrt(np.maximum(np.einsum("ij,ij->j", shapes.conj(), M @ shapes).real, 0.0))
    shapes = shapes / np.where(weight > 0.0, weight, np.abs(shapes).max(axis=0))
    size = np.abs(shapes) * np.sqrt(np.maximum(M.diagonal(), 0.0))[:, None]
    size = np.where(size.any(axis=0), size, np.abs(shapes))
    first = (size >= (1 - 1e-6) * size.max(axis=0)).argmax(axis=0)
    largest = shapes[first, np.arange(shapes.shape[1])]
    shapes = shapes * (np.abs(largest) / largest)
    T = pencil.ties.T
    parts = [M @ shapes * roots.values**2, C @ shapes * roots.values, K @ shapes]
    if T is not None:
        parts = [T.T @ part for part in parts]
    scale = sum(np.linalg.norm(part, axis=0) for part in parts)
    scale = np.where(scale > 0.0, scale, 1.0)
    relative = np.linalg.norm(sum(parts), axis=0) / scale
    still = np.abs(roots.values) <= roots.bounds
    return DampedModes(
        np.where(still, 0.0, roots.values),
        shapes,
        roots.conditions,
        roots.bounds,
        float(relative[~still].max(initial=0.0)),
        roots.method,
    )
