"""Steady response to harmonic excitation.

In normal coordinates the dynamic stiffness is Z = D + RᵀWR: D diagonal, and W (p, p) between the
rows R of what couples the modes. By the structure:

- nothing couples: the modal sum;
- a few rows: the modal sum with a low-rank update (Woodbury 1950), O(t·p²) per frequency. Close to
  an undamped resonance D nearly vanishes and the update would cancel: there Z itself is solved;
- many rows, many frequencies at one speed: complex modes of the state matrix (Foss 1958), O(t) per
  frequency, where they are well conditioned;
- else Z is solved at every frequency.
"""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from service.compute.couplings import Complexes
from service.compute.machine import Floats
from service.compute.normal_coordinates import NormalCoordinates
from service.compute.state_space import StateSpace, state_space

LOW_RANK = 0.3  # of the coordinates: with more rows than this the update saves nothing
NEAR = 1e-5  # of ω²: this close to an undamped resonance the update loses five digits
MANY = 12  # frequencies per coordinate from which complex modes pay for themselves
AGREES = 1e-10  # largest relative residual with which complex modes are trusted
BLOCK = 4_000_000  # complex numbers held at a time

SUM = "modal sum"
UPDATE = "modal sum with a low-rank update for the dampers (Woodbury)"
STATES = "complex modes of the state matrix (Foss)"
DIRECT = "direct solution of the dynamic stiffness in normal coordinates"


@dataclass(frozen=True, slots=True)
class Load:
    """A load whose amplitude is Σ (iω)^power · vector.

    Attributes
    ----------
    powers : of iω, one per vector
    vectors : (k, n) complex, on all motions: N, N·m, times s^power
    """

    powers: tuple[int, ...]
    vectors: Complexes

    def at(self, omega: Floats) -> Complexes:
        """(f, n) amplitudes."""
        return self.factors(omega) @ self.vectors

    def onto(self, B: Floats) -> "Load":
        """The same load on coordinates of which B (n, t) makes the motions."""
        return Load(self.powers, self.vectors @ B)

    def factors(self, omega: Floats) -> Complexes:
        """(f, k) powers of iω."""
        iw = 1j * omega[:, None]
        result: Complexes = iw ** np.array(self.powers, dtype=float)
        return result


@dataclass(frozen=True, slots=True)
class Responder:
    """Gives the response of a machine at any frequencies and speeds.

    Attributes
    ----------
    machine : the machine in normal coordinates
    method : how the response is computed
    """

    machine: NormalCoordinates
    method: str
    states: StateSpace | None = None

    def coordinates(self, load: Load, omega: Floats, rpm: Floats) -> Complexes:
        """(f, t) amplitudes of the normal coordinates; infinite at an undamped resonance.

        `load` acts on the normal coordinates.
        """
        forces = load.at(omega)
        step = max(1, BLOCK // (self._cost() * len(self.machine.mass)))
        parts = [
            self._block(forces[at : at + step], omega[at : at + step], rpm[at : at + step])
            for at in range(0, len(omega), step)
        ]
        return np.concatenate(parts)

    def _cost(self) -> int:
        if self.method == DIRECT:
            return len(self.machine.mass)
        return len(self.machine.couplings.rows) + 2

    def _block(self, forces: Complexes, omega: Floats, rpm: Floats) -> Complexes:
        if self.states is not None:
            return self.states.harmonic(forces, omega)
        D = self.machine.diagonal(omega)
        if self.method == SUM:
            with np.errstate(divide="ignore", invalid="ignore"):
                return np.where(forces == 0.0, 0.0, forces / D)
        if self.method == DIRECT:
            return _direct(self.machine, D, forces, omega, rpm)
        near = (np.abs(D) < NEAR * (np.abs(self.machine.stiffness) + omega[:, None] ** 2)).any(1)
        found = np.empty_like(forces)
        found[near] = _direct(self.machine, D[near], forces[near], omega[near], rpm[near])
        far = ~near
        found[far] = _updated(self.machine, D[far], forces[far], omega[far], rpm[far])
        return found


def responder(machine: NormalCoordinates, frequencies: int, rpm: Floats) -> Responder:
    """Choose the method by the structure of the machine and the number of frequencies."""
    p, t = len(machine.couplings.rows), len(machine.mass)
    if not p:
        return Responder(machine, SUM)
    if p <= LOW_RANK * t:
        return Responder(machine, UPDATE)
    if frequencies >= MANY * max(t, 50) // 10 and (rpm == rpm[0]).all():
        states = state_space(machine, float(rpm[0]), structural=True)
        if states.residual < AGREES:
            return Responder(machine, STATES, states)
    return Responder(machine, DIRECT)


def _updated(
    machine: NormalCoordinates, D: Complexes, forces: Complexes, omega: Floats, rpm: Floats
) -> Complexes:
    """D⁻¹f − D⁻¹Rᵀ(I + W·RD⁻¹Rᵀ)⁻¹W·RD⁻¹f."""
    R = machine.couplings.rows
    p = len(R)
    W = machine.couplings.at(omega, rpm)
    plain = forces / D
    between = ((1.0 / D) @ (R[:, None] * R).reshape(p * p, -1).T).reshape(-1, p, p)
    deformed = plain @ R.T
    pushed = (W @ deformed[:, :, None])[:, :, 0]
    reaction = np.linalg.solve(np.eye(p) + W @ between, pushed[:, :, None])[:, :, 0]
    result: Complexes = plain - (reaction @ R) / D
    return result


def _direct(
    machine: NormalCoordinates, D: Complexes, forces: Complexes, omega: Floats, rpm: Floats
) -> Complexes:
    R, t = machine.couplings.rows, len(machine.mass)
    Z = R.T @ machine.couplings.at(omega, rpm) @ R
    Z[:, range(t), range(t)] += D
    size = np.sqrt(np.maximum(np.abs(D), 1e-300))
    scaled = Z / size[:, :, None] / size[:, None, :]
    return _solved(scaled, forces / size) / size


def _solved(Z: Complexes, forces: Complexes) -> Complexes:
    try:
        result: Complexes = np.linalg.solve(Z, forces[:, :, None])[:, :, 0]
    except np.linalg.LinAlgError:
        rows = [_solved_one(A, f) for A, f in zip(Z, forces, strict=True)]
        return np.array(rows).reshape(forces.shape)
    return result


def _solved_one(Z: Complexes, force: Complexes) -> NDArray[Any]:
    try:
        return np.asarray(np.linalg.solve(Z, force))
    except np.linalg.LinAlgError:
        return np.full(len(force), np.inf + 0j)
