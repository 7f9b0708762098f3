"""Modes of a turning machine over its speed, each followed by its shape.

From one speed to the next the modes are paired by the correlation of their shapes (modal assurance
criterion, Allemang and Brown 1982, of complex shapes) and the nearness of their roots. Where two
roots pass each other within a step, the two alone are followed through it: to first order their
common space carries the matrix Yᴴ A(ω) X, of order 2, whose roots say whether they cross or veer
(Perkins and Mote 1986). Crossings with an excitation and the onset of instability are solved with
single roots, by inverse iteration on the quadratic problem (Ruhe 1973).
"""

from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise
from math import pi

import numpy as np
from scipy.optimize import brentq, linear_sum_assignment

from service.compute.damped_modes import Complexes
from service.compute.damped_system import Damping
from service.compute.machine import Floats, Integers

ALIKE = 0.6  # correlation of shapes below which a step is halved
MOST_HALVINGS = 8
PATH_POINTS = 65  # at which a pair of roots is followed through a step


@dataclass(frozen=True, slots=True)
class Turning:
    """(λ² + λD(ω) + Λ + S(ω))η = 0 in the coordinates of undamped modes at one speed.

    Attributes
    ----------
    values : (r,) Λ
    shapes : (n, r) the undamped shapes, in all motions
    D0, D1 : (r, r) damping, and gyroscopic terms per rad/s
    S0 : (r, r) structural damping, imaginary; or zeros
    bearings : each with its rows in these coordinates (2, r), and the symmetric stiffness of it
        that Λ holds already
    """

    values: Floats
    shapes: Floats
    D0: Floats
    D1: Floats
    S0: Floats | Complexes
    bearings: tuple[tuple[Callable[[float], tuple[Floats, Floats]], Floats, Floats], ...]

    def terms(self, rpm: float) -> tuple[Floats, Floats | Complexes]:
        """D and S at `rpm`."""
        D, S = self.D0 + (rpm * pi / 30.0) * self.D1, self.S0
        for coefficients, rows, held in self.bearings:
            K, C = coefficients(rpm)
            D = D + rows.T @ C @ rows
            S = S + rows.T @ (K - held) @ rows
        return D, S

    def matrix(self, rpm: float) -> Floats | Complexes:
        """The first-order matrix A of the scaled state (Ση, η′)."""
        D, S = self.terms(rpm)
        size, scale = len(self.values), self.scale
        A = np.zeros((2 * size, 2 * size), dtype=S.dtype)
        A[:size, size:] = np.diag(scale)
        A[size:, :size] = -(np.diag(self.values) + S) / scale
        A[size:, size:] = -D
        return A

    @property
    def scale(self) -> Floats:
        """Σ: ω, or a typical ω where that is 0."""
        omega = np.sqrt(np.abs(self.values))
        present = omega[omega > 0.0]
        typical = float(present.min()) if present.size else 1.0
        return np.where(omega > 0.0, omega, typical)


def turning(values: Floats, shapes: Floats, damping: Damping, rpm: float) -> Turning:
    """The problem over speed from undamped modes at `rpm` (all of them).

    Rigid-body motions that nothing damps or turns stay at 0 and are left out.
    """
    moved = [damping.C @ shapes, damping.H @ shapes, damping.G @ shapes]
    moved += [rows @ shapes for _, rows in damping.bearings]
    touched = np.any(
        [
            np.abs(part).max(axis=0) > 1e-12 * max(float(np.abs(part).max()), 1e-300)
            for part in moved
        ],
        axis=0,
    )
    kept = (values != 0.0) | touched
    values, shapes = values[kept], shapes[:, kept]
    omega = np.sqrt(np.maximum(values, 0.0))
    D0 = shapes.T @ damping.C @ shapes
    D0 = D0 + np.diag(2 * damping.ratio * omega + damping.alpha + damping.beta * values)
    S0 = np.zeros_like(D0)
    bearings = []
    for bearing, rows in damping.bearings:
        K, _ = bearing.coefficients(rpm)
        bearings.append((bearing.coefficients, rows @ shapes, (K + K.T) / 2))
    return Turning(
        values,
        shapes,
        D0,
        shapes.T @ damping.G @ shapes,
        1j * (shapes.T @ damping.H @ shapes) if damping.H.any() else S0,
        tuple(bearings),
    )


@dataclass(frozen=True, slots=True)
class Station:
    """The roots of the upper half plane and the real ones at one speed, by size.

    `X` holds their unit right vectors, `everything` those of all roots, of which `upper` are shown.
    """

    rpm: float
    roots: Complexes
    X: Complexes
    everything: Complexes
    upper: Integers

    def left(self) -> Complexes:
        """Left vectors Y with YᴴX = 1."""
        try:
            inverse = np.linalg.inv(self.everything)
        except np.linalg.LinAlgError:
            inverse = np.linalg.pinv(self.everything)
        return inverse.conj().T[:, self.upper]


@dataclass(frozen=True, slots=True)
class Map:
    """Modes over speed.

    Attributes
    ----------
    rpm : (p,) speeds
    roots : (p, m) root of each mode at each speed, 1/s
    states : (p, 2r, m) right vectors
    least_alike : (m,) the smallest correlation between neighbouring speeds
    halvings : how many speeds were added on the way
    """

    rpm: Floats
    roots: Complexes
    states: Complexes
    least_alike: Floats
    halvings: int


def station(problem: Turning, rpm: float) -> Station:
    """Solve the problem at one speed."""
    roots, X = np.linalg.eig(problem.matrix(rpm))
    size = np.abs(roots)
    upper = np.flatnonzero(roots.imag >= -1e-13 * size)
    upper = upper[np.argsort(size[upper], kind="stable")]
    return Station(rpm, roots[upper], X[:, upper], X, upper)


def follow(problem: Turning, speeds: Floats, count: int) -> Map:
    """Follow the lowest `count` oscillating modes of the first speed through all of them."""
    here = station(problem, float(speeds[0]))
    chosen = np.flatnonzero(here.roots.imag > 0.0)[:count]
    count = len(chosen)
    rows, states, worst = [here.roots[chosen]], [here.X[:, chosen]], np.ones(count)
    halvings = 0
    for rpm in speeds[1:]:
        there = station(problem, float(rpm))
        chosen, alike, added = _step(problem, here, there, chosen, 0)
        halvings += added
        worst = np.minimum(worst, alike)
        rows.append(there.roots[chosen])
        states.append(there.X[:, chosen])
        here = there
    return Map(speeds, np.array(rows), np.array(states), worst, halvings)


def _step(
    problem: Turning, here: Station, there: Station, chosen: Integers, depth: int
) -> tuple[Integers, Floats, int]:
    """Which roots `there` continue the `chosen` ones, how alike their shapes are, speeds added."""
    pairing, alike = _paired(here, there)
    pairing = _unpassed(problem, here, there, pairing, chosen)
    if alike[chosen].min(initial=1.0) >= ALIKE or depth == MOST_HALVINGS:
        return pairing[chosen], alike[chosen], 0
    middle = station(problem, (here.rpm + there.rpm) / 2)
    first, alike_first, more = _step(problem, here, middle, chosen, depth + 1)
    second, alike_second, yet_more = _step(problem, middle, there, first, depth + 1)
    return second, np.minimum(alike_first, alike_second), 1 + more + yet_more


def _paired(here: Station, there: Station) -> tuple[Integers, Floats]:
    """For each root here the one there, by correlation of states and nearness of roots.

    The scaled state (Ση, η′) makes the plain inner product one of energy.
    """
    correlation = np.abs(here.X.conj().T @ there.X) ** 2
    distance = np.abs(here.roots[:, None] - there.roots)
    near = distance / (np.abs(here.roots)[:, None] + np.abs(there.roots))
    rows, columns = linear_sum_assignment(near - np.minimum(correlation, 1.0))
    pairing = np.argmin(distance, axis=1)  # where two real roots have merged, both go on as one
    pairing[rows] = columns
    alike = np.zeros(len(here.roots))
    # Roots that coincide share a space: what counts is how much of the shape lies in it.
    close = (
        distance[rows]
        <= 2 * distance[rows, columns][:, None] + 1e-6 * np.abs(here.roots[rows])[:, None]
    )
    alike[rows] = np.minimum((correlation[rows] * close).sum(axis=1), 1.0)
    return pairing, alike


def _unpassed(
    problem: Turning, here: Station, there: Station, pairing: Integers, chosen: Integers
) -> Integers:
    """Exchange the pairs that seem to pass each other where in truth they veer."""
    before, after = here.roots.imag, there.roots.imag[pairing]
    passed = (before[:, None] < before) & (after[:, None] > after)
    followed = np.isin(np.arange(len(before)), chosen)
    pairs = np.argwhere(passed & (followed[:, None] | followed)).tolist()
    if not pairs:
        return pairing
    change = problem.matrix(there.rpm) - problem.matrix(here.rpm)
    Y, result = here.left(), pairing.copy()
    for i, j in sorted(pairs, key=lambda pair: float(before[pair[1]] - before[pair[0]])):
        if _veers(here, Y, change, i, j):
            result[i], result[j] = result[j], result[i]
    return result


def _veers(here: Station, Y: Complexes, change: Floats | Complexes, i: int, j: int) -> bool:
    """Whether two roots, followed through a step in their common space, keep their order."""
    both = [i, j]
    B = Y[:, both].conj().T @ change @ here.X[:, both]
    share = np.linspace(0.0, 1.0, PATH_POINTS)
    difference = here.roots[i] - here.roots[j] + share * (B[0, 0] - B[1, 1])
    coupling = 4.0 * share**2 * B[0, 1] * B[1, 0]
    if np.abs(coupling[-1]) <= (1e-9 * np.abs(here.roots[i])) ** 2:
        return False
    gap: Complexes = np.sqrt(difference**2 + coupling)
    # Continuous branch of the square root, from λᵢ − λⱼ on.
    for place in range(1, PATH_POINTS):
        if (gap[place] * np.conj(gap[place - 1])).real < 0.0:
            gap[place:] = -gap[place:]
    start = here.roots[i] - here.roots[j]
    if (gap[0] * np.conj(start)).real < 0.0:
        gap = -gap
    return bool(gap[-1].imag * start.imag > 0.0)


def refined(problem: Turning, rpm: float, root: complex, state: Complexes) -> complex:
    """The root at `rpm` near `root`, by inverse iteration on the quadratic problem."""
    x = state[: len(problem.values)] / problem.scale
    return _inverse_iteration(problem, rpm, root, x)[0]


def root_state(problem: Turning, rpm: float, root: complex) -> Complexes:
    """The state vector (Ση, η′) of a known root at `rpm`."""
    start = np.random.default_rng(5).standard_normal(len(problem.values)) + 0.0j
    _, x = _inverse_iteration(problem, rpm, root * (1.0 + 1e-9), start)
    return np.concatenate([problem.scale * x, root * x])


def _inverse_iteration(
    problem: Turning, rpm: float, root: complex, x: Complexes
) -> tuple[complex, Complexes]:
    D, S = problem.terms(rpm)
    K = np.diag(problem.values) + S
    identity = np.eye(len(problem.values))
    x = x / np.linalg.norm(x)
    for _ in range(40):
        slope = 2 * root * x + D @ x
        try:
            u = np.linalg.solve(root**2 * identity + root * D + K, slope)
        except np.linalg.LinAlgError:
            break
        v = x.conj()
        step = complex((v @ x) / (v @ u))
        root = root - step
        x = u / np.linalg.norm(u)
        if abs(step) <= 4e-16 * abs(root):
            break
    return root, x


def solve_between(
    problem: Turning,
    found: Map,
    mode: int,
    place: int,
    wanted: Callable[[complex, float], float],
) -> float | None:
    """The speed between two neighbouring ones where `wanted(root, rpm)` vanishes, to 1e-12."""
    low, high = float(found.rpm[place]), float(found.rpm[place + 1])

    def value(rpm: float) -> float:
        share = (rpm - low) / (high - low)
        first, second = found.roots[place, mode], found.roots[place + 1, mode]
        guess = complex((1.0 - share) * first + share * second)
        nearer = place if share < 0.5 else place + 1
        return wanted(refined(problem, rpm, guess, found.states[nearer, :, mode]), rpm)

    ends = wanted(found.roots[place, mode], low), wanted(found.roots[place + 1, mode], high)
    if ends[0] == 0.0:
        return low
    if ends[0] * ends[1] > 0.0:
        return None
    try:
        return float(brentq(value, low, high, xtol=1e-13 * high, rtol=1e-13))
    except ValueError:
        return None


def crossings(
    problem: Turning, found: Map, order: float | None, frequency: float | None = None
) -> list[tuple[int, float, complex]]:
    """(mode, rpm, root) where |λ|/2π equals `order` times the speed, or `frequency` in Hz."""

    def away(root: complex, rpm: float) -> float:
        excited = order * rpm / 60.0 if order is not None else frequency or 0.0
        return abs(root) / (2 * pi) - excited

    if order is None:
        # A mode that doesn't change with speed meets a fixed frequency everywhere or nowhere.
        sizes = np.abs(found.roots)
        moving = np.ptp(sizes, axis=0) > 1e-9 * sizes.max(axis=0)
        return [item for item in _all(problem, found, away) if moving[item[0]]]
    return _all(problem, found, away)


def onsets(problem: Turning, found: Map) -> list[tuple[int, float, complex]]:
    """(mode, rpm, root) where a mode's growth rate changes sign; what is 0 to roundoff doesn't."""

    def growth(root: complex, _: float) -> float:
        return root.real

    noise = 1e-11 * np.abs(found.roots)
    decays = np.asarray((found.roots.real < -noise).any(axis=0))
    grows = np.asarray((found.roots.real > noise).any(axis=0))
    sure = decays & grows
    return [item for item in _all(problem, found, growth) if sure[item[0]]]


def _all(
    problem: Turning, found: Map, wanted: Callable[[complex, float], float]
) -> list[tuple[int, float, complex]]:
    solved = []
    for mode in range(found.roots.shape[1]):
        values = [
            wanted(complex(root), float(rpm))
            for root, rpm in zip(found.roots[:, mode], found.rpm, strict=True)
        ]
        for place, (first, second) in enumerate(pairwise(values)):
            if first * second < 0.0 or first == 0.0:
                rpm = solve_between(problem, found, mode, place, wanted)
                if rpm is not None:
                    root = refined(
                        problem,
                        rpm,
                        complex(found.roots[place, mode]),
                        found.states[place, :, mode],
                    )
                    solved.append((mode, rpm, root))
    return sorted(solved, key=lambda item: item[1])
