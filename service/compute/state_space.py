"""A machine's equation of motion as first-order equations that stand alone: z′ = λz + input.

The state matrix of the normal coordinates is diagonalized by its complex modes (Foss, Journal of
Applied Mechanics 25, 1958). Where nothing couples the coordinates, each has its two roots in closed
form. Of a nearly double root (critical damping) the two terms would cancel; there the kernel is a
mean over a circle around it, by Cauchy's integral formula with the trapezoidal rule, which
converges geometrically (Trefethen and Weideman, SIAM Review 56, 2014).
"""

from dataclasses import dataclass
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csr_array

from service.compute.couplings import Complexes
from service.compute.machine import Floats
from service.compute.normal_coordinates import NormalCoordinates
from service.compute.pencil import EPS

Map: TypeAlias = Any  # an ndarray, or a scipy.sparse array where nothing couples

CRITICAL = 2e-3  # of the mean root: roots closer than this are taken together
CIRCLE, RADIUS = 18, 0.1  # points, and radius over the mean root: the kernel holds to 1e-16
ILL_CONDITIONED = 1e-10  # relative error of the modes from which another matrix is taken
NUDGES, NUDGED_BY = (1e-11, 1e-10, 1e-9), 2007  # sizes over the matrix, seed of the direction
WITHOUT_DAMPING = 1e-12  # of the largest damping: a massless motion with less has none


@dataclass(frozen=True, slots=True)
class StateSpace:
    """s first-order equations, and how the t normal coordinates hang on them.

    η = Re(readout·z) + direct·f and z′ = λz + inlet·f, besides the free coordinates, which neither
    stiffness nor damping touches: η″ = f.

    Attributes
    ----------
    roots : (s,) λ, 1/s; of conjugate pairs the upper one
    readout : (t, s), weights included
    inlet : (s, t) from forces
    from_displacement, from_velocity : (s, t) initial z
    direct : (t, t) motions without inertia and damping, which follow at once
    free : (t,) which coordinates are free
    paired : (s,) whether the root stands for itself and its conjugate
    circle : (s,) whether the root is a point on the circle around a nearly double root
    residual : relative error to expect from the condition of the modes
    """

    roots: Complexes
    readout: Map
    inlet: Map
    from_displacement: Map
    from_velocity: Map
    direct: Map
    free: NDArray[np.bool_]
    paired: NDArray[np.bool_]
    circle: NDArray[np.bool_]
    residual: float

    def harmonic(self, forces: Complexes, omega: Floats) -> Complexes:
        """(f, t) coordinates for forces (f, t); only where no root was left out as a conjugate."""
        pushed = (self.inlet @ forces.T).T / (1j * omega[:, None] - self.roots)
        found: Complexes = (self.readout @ pushed.T).T + (self.direct @ forces.T).T
        found[:, self.free] -= forces[:, self.free] / omega[:, None] ** 2
        return found


def state_space(machine: NormalCoordinates, rpm: float, structural: bool = False) -> StateSpace:
    """The first-order form at one shaft speed.

    Parameters
    ----------
    structural : keep loss factors as a complex stiffness (harmonic motion only, both roots of each
        pair are kept); otherwise they become viscous damping of each mode's own, h/ω, the usual
        equivalent at resonance
    """
    c = machine.couplings
    if not len(c.rows) and not structural:
        return _uncoupled(machine)
    K, C = c.fixed(rpm)
    D = c.rows.T @ C @ c.rows + np.diag(machine.damping)
    S = c.rows.T @ K @ c.rows + np.diag(machine.stiffness)
    H = c.rows.T @ c.structural @ c.rows + np.diag(machine.structural)
    if structural and H.any():
        return _coupled(machine, D, S + 1j * H, True)
    if not structural:
        D = D + _equivalent(machine, H.diagonal())
    return _coupled(machine, D, S, structural)


def _equivalent(machine: NormalCoordinates, h: Floats) -> Floats:
    """h/ω of each mode; a motion without inertia keeps none."""
    omega = np.sqrt(np.abs(machine.stiffness))
    viscous = np.divide(h, omega, out=np.zeros_like(h), where=(omega > 0.0) & (machine.mass > 0.0))
    matrix: Floats = np.diag(viscous)
    return matrix


def _uncoupled(machine: NormalCoordinates) -> StateSpace:
    t = len(machine.mass)
    damping = machine.damping + _equivalent(machine, machine.structural).diagonal()
    free = machine.rigid & (damping == 0.0)
    moving = np.flatnonzero((machine.mass > 0.0) & ~free)
    lagging = np.flatnonzero((machine.mass == 0.0) & (damping != 0.0))
    at_once = np.flatnonzero((machine.mass == 0.0) & (damping == 0.0))
    parts = [_second_order(int(j), damping[j], machine.stiffness[j]) for j in moving]
    parts += [[(int(j), -machine.stiffness[j] / damping[j], 1.0 / damping[j], 1.0, False)]
              for j in lagging]  # fmt: skip
    flat = [term for part in parts for term in part]
    place = np.array([term[0] for term in flat], dtype=int)
    roots = np.array([term[1] for term in flat], dtype=complex)
    gain = np.array([term[2] for term in flat], dtype=complex)
    weight = np.array([term[3] for term in flat])
    circle = np.array([term[4] for term in flat], dtype=bool)
    s = np.arange(len(flat))
    started = np.where(machine.mass[place] > 0.0, gain * (roots + damping[place]), 1.0)
    still = np.where(machine.mass[place] > 0.0, gain, 0.0)
    size = (len(flat), t)
    return StateSpace(
        roots,
        csr_array((weight, (place, s)), shape=(t, len(flat))),
        csr_array((gain, (s, place)), shape=size),
        csr_array((started, (s, place)), shape=size),
        csr_array((still, (s, place)), shape=size),
        csr_array((1.0 / machine.stiffness[at_once], (at_once, at_once)), shape=(t, t)),
        free,
        weight == 2.0,
        circle,
        EPS,
    )


Term: TypeAlias = tuple[int, complex, complex, float, bool]


def _second_order(place: int, c: float, k: float) -> list[Term]:
    """Roots and gains of x″ + cx′ + kx = f: x = Σ Re(weight·z), z′ = λz + gain·f."""
    half = c / 2.0
    spread = np.sqrt(complex(half * half - k))
    if abs(spread) < CRITICAL * abs(half):
        return _on_circle(place, half, spread)
    if k > half * half:
        root = complex(-half, spread.imag)
        return [(place, root, 1.0 / (2j * spread.imag), 2.0, False)]
    far = -half - spread if half >= 0.0 else -half + spread
    near = k / far
    gain = 1.0 / (far - near)
    return [(place, far, gain, 1.0, False), (place, near, -gain, 1.0, False)]


def _on_circle(place: int, half: float, spread: complex) -> list[Term]:
    arms = RADIUS * half * np.exp(2j * np.pi * (np.arange(CIRCLE) + 0.5) / CIRCLE)
    gains = arms / (arms**2 - spread**2) / CIRCLE
    return [(place, -half + arm, gain, 1.0, True) for arm, gain in zip(arms, gains, strict=True)]


def _coupled(
    machine: NormalCoordinates, D: NDArray[Any], S: NDArray[Any], both: bool
) -> StateSpace:
    free = machine.rigid & _untouched(D) & _untouched(S)
    order = _Order(machine, D, S, free)
    A, inlet, output, direct = order.matrices()
    roots, X, error = _diagonalized(A)
    left = np.linalg.inv(X)
    start = order.start()
    if both or np.iscomplexobj(A):
        kept, weight = np.arange(len(roots)), np.ones(len(roots))
    else:
        kept = np.flatnonzero(roots.imag >= 0.0)
        weight = np.where(roots[kept].imag > 0.0, 2.0, 1.0)
    left = left[kept]
    return StateSpace(
        roots[kept].astype(complex),
        (output @ X)[:, kept] * weight,
        left @ inlet,
        left @ start[0],
        left @ start[1],
        direct,
        free,
        weight == 2.0,
        np.zeros(len(kept), dtype=bool),
        error,
    )


def _diagonalized(A: NDArray[Any]) -> tuple[NDArray[Any], NDArray[Any], float]:
    """Roots and modes of A, and the relative error that they bring in.

    Where A is defective or nearly so, a matrix very near to it is taken, whose modes are far
    better conditioned (Davies, SIAM J. Matrix Anal. Appl. 29, 2007); of several the best one.
    """
    roots, X = np.linalg.eig(A)
    error = EPS * float(np.linalg.cond(X)) if len(A) else 0.0
    if error < ILL_CONDITIONED:
        return roots, X, error
    nudge = np.random.default_rng(NUDGED_BY).standard_normal(A.shape) / np.sqrt(len(A))
    size = float(np.linalg.norm(A, 2))
    found = [(step, *np.linalg.eig(A + step * size * nudge)) for step in NUDGES]
    errors = [step + EPS * float(np.linalg.cond(X)) for step, _, X in found]
    best = int(np.argmin(errors))
    return found[best][1], found[best][2], errors[best]


def _untouched(A: NDArray[Any]) -> NDArray[np.bool_]:
    size = np.abs(A)
    largest = np.maximum(size.max(axis=0), size.max(axis=1))
    untouched: NDArray[np.bool_] = largest <= 1e-13 * max(float(size.max()), 1e-300)
    return untouched


class _Order:
    """Sorts the coordinates: a with mass, b massless and damped, l massless without damping."""

    def __init__(
        self, machine: NormalCoordinates, D: NDArray[Any], S: NDArray[Any], free: NDArray[np.bool_]
    ) -> None:
        t = len(machine.mass)
        moving = np.flatnonzero((machine.mass > 0.0) & ~free)
        bare = np.flatnonzero(machine.mass == 0.0)
        D00 = D[np.ix_(bare, bare)]
        values, vectors = np.linalg.eigh((D00 + D00.T) / 2) if len(bare) else (
            np.zeros(0), np.zeros((0, 0))
        )  # fmt: skip
        some = np.abs(values) > WITHOUT_DAMPING * max(float(np.abs(D).max()), 1e-300)
        identity = np.eye(t)
        self.a = identity[:, moving]
        self.b = identity[:, bare] @ vectors[:, some]
        self.l = identity[:, bare] @ vectors[:, ~some]
        self.D, self.S = D, S
        omega = np.sqrt(np.abs(machine.stiffness[moving]))
        present = omega[omega > 0.0]
        typical = float(present.min()) if present.size else float(np.abs(D).max()) or 1.0
        self.scale = np.where(omega > 0.0, omega, typical)

    def matrices(self) -> tuple[NDArray[Any], NDArray[Any], NDArray[Any], NDArray[Any]]:
        """A, the inlet of forces, the output of coordinates, and what follows at once.

        State: (Σa, a′, b), Σ the scale that makes displacement and velocity alike.
        """
        a, b, loose = self.a, self.b, self.l
        r, z = a.shape[1], b.shape[1]
        kept = np.hstack([a, b])
        inverse = np.linalg.inv(loose.T @ self.S @ loose)
        direct = loose @ inverse @ loose.T
        follow = kept - direct @ self.S @ kept
        push = (kept - direct.T @ self.S.T @ kept).T
        K, C = push @ self.S @ follow, kept.T @ self.D @ kept
        solved = np.linalg.inv(C[r:, r:])
        from_b = C[:r, r:] @ solved
        A = np.zeros((2 * r + z, 2 * r + z), dtype=K.dtype)
        A[:r, r : 2 * r] = np.diag(self.scale)
        A[r : 2 * r, :r] = -(K[:r, :r] - from_b @ K[r:, :r]) / self.scale
        A[r : 2 * r, r : 2 * r] = -(C[:r, :r] - from_b @ C[r:, :r])
        A[r : 2 * r, 2 * r :] = -(K[:r, r:] - from_b @ K[r:, r:])
        A[2 * r :, :r] = -solved @ K[r:, :r] / self.scale
        A[2 * r :, r : 2 * r] = -solved @ C[r:, :r]
        A[2 * r :, 2 * r :] = -solved @ K[r:, r:]
        inlet = np.vstack([np.zeros((r, push.shape[1])), push[:r] - from_b @ push[r:],
                           solved @ push[r:]])  # fmt: skip
        output = np.hstack([follow[:, :r] / self.scale, np.zeros((len(follow), r)), follow[:, r:]])
        return A, inlet, output, direct

    def start(self) -> tuple[NDArray[Any], NDArray[Any]]:
        """(states, t) of initial displacements and velocities."""
        r, z, t = self.a.shape[1], self.b.shape[1], len(self.D)
        displaced = np.vstack([self.scale[:, None] * self.a.T, np.zeros((r, t)), self.b.T])
        moving = np.vstack([np.zeros((r, t)), self.a.T, np.zeros((z, t))])
        return displaced, moving
