"""Where a machine resonates, and how wide: for spacing and warnings, not for answers."""

import numpy as np

from service.compute.machine import Floats
from service.compute.normal_coordinates import NormalCoordinates
from service.compute.state_space import state_space

SOLVED_UP_TO = 120  # coordinates: above, coupling between modes is left out
SPEEDS = 13


def resonances(machine: NormalCoordinates, rpm: float) -> tuple[Floats, Floats]:
    """(m,) angular frequencies of largest response, and half the half-power widths, rad/s."""
    if len(machine.couplings.rows) and len(machine.mass) <= SOLVED_UP_TO:
        states = state_space(machine, rpm)
        roots = states.roots[states.paired]
        order = np.argsort(roots.imag)
        omega, decay = np.asarray(roots.imag, dtype=float), np.asarray(roots.real, dtype=float)
        return omega[order], np.abs(decay)[order]
    return _one_by_one(machine, rpm)


def _one_by_one(machine: NormalCoordinates, rpm: float) -> tuple[Floats, Floats]:
    """Each mode by its own damping, as if nothing coupled it to others."""
    rows, modes = machine.couplings.rows, machine.modes
    _, C = machine.couplings.fixed(rpm)
    H = machine.couplings.structural
    viscous = machine.damping + (rows * (C @ rows)).sum(axis=0)
    lost = machine.structural + (rows * (H @ rows)).sum(axis=0)
    omega = np.sqrt(np.maximum(machine.stiffness, 0.0))[:modes]
    present = omega > 0.0
    omega, viscous, lost = omega[present], viscous[:modes][present], lost[:modes][present]
    return omega, np.abs(viscous + lost / omega) / 2


def crossings(
    machine: NormalCoordinates, order: float, low: float, high: float
) -> tuple[Floats, Floats]:
    """Speeds (rpm) where an order meets a resonance, and half their half-power widths in rpm."""
    factor = 30.0 / (np.pi * order)
    moving = machine.couplings.gyroscopic.any() or any(
        len(bearing.rpm) > 1 for bearing, _, _ in machine.couplings.bearings
    )
    if not moving:
        omega, half = resonances(machine, low)
        return factor * omega, factor * half
    speeds = np.geomspace(low, high, SPEEDS) if high > low else np.array([low, low])
    found = [resonances(machine, float(speed)) for speed in speeds]
    number = min(len(omega) for omega, _ in found)
    omega = np.array([part[:number] for part, _ in found])
    half = np.array([part[:number] for _, part in found])
    ahead = factor * omega - speeds[:, None]
    step, mode = np.nonzero((ahead[:-1] > 0.0) & (ahead[1:] <= 0.0))
    share = ahead[step, mode] / (ahead[step, mode] - ahead[step + 1, mode])
    centres = speeds[step] + share * (speeds[step + 1] - speeds[step])
    return centres, factor * np.maximum(half[step, mode], half[step + 1, mode])
