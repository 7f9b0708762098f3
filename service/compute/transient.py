"""Response over time, exact for the stated input.

The state z of each complex mode obeys z′ = λz + input (`state_space`), and the inputs are
polynomials on segments (`signals`): every value is evaluated from closed forms, and the spacing of
the times has no influence on it.
"""

from dataclasses import dataclass

import numpy as np

from service.compute.couplings import Complexes
from service.compute.machine import Floats
from service.compute.normal_coordinates import NormalCoordinates
from service.compute.signals import Signal, driven, twice_integrated
from service.compute.state_space import StateSpace

BLOCK = 4_000_000  # complex numbers held at a time


@dataclass(frozen=True, slots=True)
class Input:
    """A signal that acts on the normal coordinates in the proportions `forces` (t,)."""

    signal: Signal
    forces: Floats


@dataclass(frozen=True, slots=True)
class TimeHistory:
    """The motion of a machine from its initial state, under its inputs.

    Attributes
    ----------
    states : the first-order form
    start : (s,) initial z
    displaced, moving : (t,) initial coordinates and their rates, used for the free ones
    inputs : what acts
    """

    states: StateSpace
    start: Complexes
    displaced: Floats
    moving: Floats
    inputs: tuple[Input, ...]

    def seen(self, rows: list[tuple[int, Floats]], times: Floats) -> Floats:
        """(o, n) values of Σ rows·(d/dt)^power of the normal coordinates at `times`.

        Parameters
        ----------
        rows : power (0 to 2) and (o, t) rows of each term
        times : (n,) ascending, s
        """
        found = self._at_once(rows, times) + self._free(rows, times)
        weights = [(power, self.states.readout.T @ part.T) for power, part in rows]
        step = max(1, BLOCK // max(len(times), 1))
        for first in range(0, len(self.states.roots), step):
            block = slice(first, first + step)
            found += self._of_states(block, [(p, w[block].T) for p, w in weights], times)
        return found

    def _of_states(
        self, block: slice, weights: list[tuple[int, Complexes]], times: Floats
    ) -> Floats:
        roots = self.states.roots[block]
        start = self.start[block]
        z = np.zeros((len(roots), len(times)), dtype=complex)
        if start.any():
            z += start[:, None] * np.exp(roots[:, None] * times)
        pushes = [(item, (self.states.inlet @ item.forces)[block]) for item in self.inputs]
        for item, push in pushes:
            z += push[:, None] * driven(roots, item.signal, times)
        found = np.zeros((weights[0][1].shape[0], len(times)))
        for power, weight in weights:
            found += _real_product(weight * roots**power, z)
            for item, push in pushes:
                for order in range(power):
                    own = (weight * roots ** (power - 1 - order)) @ push
                    found += np.outer(own.real, item.signal.at(times, order))
        return found

    def _at_once(self, rows: list[tuple[int, Floats]], times: Floats) -> Floats:
        """Motions without inertia and damping follow the force as it is."""
        found = np.zeros((rows[0][1].shape[0], len(times)))
        for item in self.inputs:
            followed = np.real(self.states.direct @ item.forces)
            if followed.any():
                for power, part in rows:
                    found += np.outer(part @ followed, item.signal.at(times, power))
        return found

    def _free(self, rows: list[tuple[int, Floats]], times: Floats) -> Floats:
        """Coordinates that nothing brings back: η″ = f."""
        free = self.states.free
        found = np.zeros((rows[0][1].shape[0], len(times)))
        if not free.any():
            return found
        for power, part in rows:
            own = part[:, free]
            found += np.outer(own @ self.displaced[free], times**0 if power == 0 else 0 * times)
            found += np.outer(own @ self.moving[free], _slope(times, power))
            for item in self.inputs:
                if item.forces[free].any():
                    path = twice_integrated(item.signal, times, power)
                    found += np.outer(own @ item.forces[free], path)
        return found


def _slope(times: Floats, power: int) -> Floats:
    """t, or its first or second derivative."""
    return times if power == 0 else np.full(len(times), 1.0 if power == 1 else 0.0)


def _real_product(A: Complexes, z: Complexes) -> Floats:
    """Re(A·z) in real arithmetic."""
    product: Floats = A.real @ z.real - A.imag @ z.imag
    return product


def time_history(
    machine: NormalCoordinates,
    states: StateSpace,
    initial: tuple[Floats, Floats],
    inputs: list[Input],
) -> TimeHistory:
    """The motion from initial coordinates and rates (t,) each."""
    displaced, moving = initial
    start = states.from_displacement @ displaced + states.from_velocity @ moving
    acting = tuple(item for item in inputs if item.forces.any())
    assert len(displaced) == len(machine.mass)
    return TimeHistory(states, np.asarray(start, dtype=complex), displaced, moving, acting)


@dataclass(frozen=True, slots=True)
class Term:
    """One root's part in a free motion: Re(coefficient·e^{λt}), and a drift of free coordinates.

    Attributes
    ----------
    root : λ, 1/s
    coefficients : (o,) complex
    drift : (o,) per second, None but for the free coordinates
    """

    root: complex
    coefficients: Complexes
    drift: Floats | None = None


def terms(found: TimeHistory, rows: Floats) -> list[Term]:
    """The terms of a free motion seen through `rows` (o, t), by the size of the roots.

    Roots on a circle around a critically damped one mean nothing by themselves and are left out.
    """
    states = found.states
    listed: list[Term] = []
    free = states.free
    if free.any():
        own = rows[:, free]
        listed.append(Term(0j, (own @ found.displaced[free]).astype(complex),
                           own @ found.moving[free]))  # fmt: skip
    weights = np.asarray(states.readout.T @ rows.T).T
    for j in np.argsort(np.abs(states.roots), kind="stable"):
        if not states.circle[j]:
            listed.append(Term(complex(states.roots[j]), weights[:, j] * found.start[j]))
    return listed


def dissipated(found: TimeHistory, B: Floats, C: Floats, end: float) -> float:
    """∫ vᵀCv dt of a free motion from 0 to `end`, in closed form, J.

    Parameters
    ----------
    B : (n, t) motions from normal coordinates
    C : (n, n) viscous damping, N·s/m

    Notes
    -----
    With v = Re Σ aⱼe^{λⱼt}: ½Re Σⱼₖ aⱼᵀC(aₖφ(λⱼ + λₖ) + āₖφ(λⱼ + λ̄ₖ)), φ(s) = (e^{sT} − 1)/s.
    Free coordinates move C nowhere.
    """
    roots = found.states.roots
    a = (B @ np.asarray(found.states.readout @ np.diag(roots * found.start))).T
    same = (a @ C @ a.T) * _grown(roots[:, None] + roots, end)
    other = (a @ C @ a.conj().T) * _grown(roots[:, None] + roots.conj(), end)
    return float((same.sum() + other.sum()).real / 2)


def _grown(s: Complexes, end: float) -> Complexes:
    small = np.abs(s) * end < 1e-8
    safe = np.where(small, 1.0 / end, s)
    return np.where(small, end * (1 + s * end / 2), np.expm1(safe * end) / safe)


def largest(found: Floats, times: Floats) -> list[int]:
    """Index of the value of largest size in each row of (o, n)."""
    assert found.shape[1] == len(times)
    places: list[int] = np.abs(found).argmax(axis=1).tolist()
    return places
