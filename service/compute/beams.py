"""Straight beams of constant section: deformation rows and consistent mass.

A beam of length L between two nodes deforms in six ways: it stretches, twists, and in each of two
planes bends with equal end rotations (S-shaped) or opposite ones (C-shaped). With the slopes taken
from the chord, its strain energy is a sum of squares,

    2U = EA/L·(u₂−u₁)² + GJ/L·(θx₂−θx₁)²
         + Σ over planes: EI/L·(θ₂−θ₁)² + 3EI/(L(1+Φ))·(θ₁+θ₂−2ψ)²

with ψ the chord's slope and Φ = 12EI/(G·Aₛ·L²) (Przemieniecki, Theory of Matrix Structural
Analysis, 1968, §5.6, in another form). A tension N adds N·∫v′²dx = N·L·ψ² + N·L/12·(θ₂−θ₁)² +
N·L/20·(θ₁+θ₂−2ψ)² for cubic deflections (the usual consistent geometric stiffness).
"""

from collections.abc import Iterator
from dataclasses import dataclass
from math import inf

import numpy as np

from service.compute.machine import Floats, Rotation, Section, Vector


@dataclass(frozen=True, slots=True)
class Deformation:
    """One way to deform: stiffness, and what each end's motions (own axes) contribute.

    `first` and `second` are 6 coefficients on x y z rx ry rz.
    """

    k: float
    first: tuple[float, ...]
    second: tuple[float, ...]


def own_axes(first: Vector, second: Vector, up: Vector | None) -> Rotation:
    """A beam's own x, y, z as rows: y lies in the plane of x and `up`.

    Where `up` is None it is the space's y, or −x for a beam along y, so that a beam along x has
    the axes of space.
    """
    x = np.subtract(second, first)
    x = x / np.linalg.norm(x)
    if up is None:
        up = (-1.0, 0.0, 0.0) if abs(x[1]) > 1.0 - 1e-9 else (0.0, 1.0, 0.0)
    y = np.asarray(up, dtype=float) - x * float(np.dot(x, up))
    y /= np.linalg.norm(y)
    rows = np.array([x, y, np.cross(x, y)]) + 0.0
    a, b, c = ((float(p), float(q), float(r)) for p, q, r in rows)
    return a, b, c


def shear_ratio(EI: float, GA: float, length: float) -> float:
    """Φ = 12EI/(GA·L²)."""
    return 0.0 if inf == GA else 12.0 * EI / (GA * length**2)


def deformations(section: Section, length: float, tension: float) -> Iterator[Deformation]:
    """The rows of one element of `length`."""
    yield _pair(section.EA / length, 0, 1.0)
    yield _pair(section.GJ / length, 3, 1.0)
    # In the x-y plane the slope is +θz, in the x-z plane it is −θy.
    yield from _bending(section.EIz, section.GAy, length, tension, 1, 5, 1.0)
    yield from _bending(section.EIy, section.GAz, length, tension, 2, 4, -1.0)


def _pair(k: float, axis: int, factor: float) -> Deformation:
    row = tuple(factor if number == axis else 0.0 for number in range(6))
    return Deformation(k, tuple(-value for value in row), row)


def _bending(
    EI: float, GA: float, length: float, tension: float, across: int, turn: int, sign: float
) -> Iterator[Deformation]:
    phi = shear_ratio(EI, GA, length)
    yield _pair(EI / length + tension * length / 12.0, turn, 1.0)
    first, second = [0.0] * 6, [0.0] * 6
    first[turn] = second[turn] = 1.0
    first[across], second[across] = sign * 2.0 / length, -sign * 2.0 / length
    k = 3.0 * EI / (length * (1.0 + phi)) + tension * length / 20.0
    yield Deformation(k, tuple(first), tuple(second))
    if tension != 0.0:
        yield _pair(tension * length, across, 1.0 / length)


def mass(section: Section, length: float) -> Floats:
    """(12, 12) consistent mass of one element in own axes, x y z rx ry rz at each end.

    Translation and rotary inertia by the exact static deflections (Friedman and Kosmatka, Computers
    & Structures 47(3), 1993; coefficients from memory, checked in the tests against the integrals).
    """
    M = np.zeros((12, 12))
    line = np.array([[2.0, 1.0], [1.0, 2.0]]) / 6.0
    M[np.ix_((0, 6), (0, 6))] = section.mass * length * line
    M[np.ix_((3, 9), (3, 9))] = section.polar * length * line
    for across, turn, sign, EI, GA, rotary in (
        (1, 5, 1.0, section.EIz, section.GAy, section.Iz),
        (2, 4, -1.0, section.EIy, section.GAz, section.Iy),
    ):
        phi = shear_ratio(EI, GA, length)
        signs = np.array([1.0, sign, 1.0, sign])
        plane = _bending_mass(section.mass, rotary, length, phi) * signs[:, None] * signs
        numbers = (across, turn, across + 6, turn + 6)
        M[np.ix_(numbers, numbers)] = plane
    return M


def gyroscopic(section: Section, length: float) -> Floats:
    """(12, 12) gyroscopic matrix of one element per rad/s of spin about its own axis.

    The same slopes as in the rotary inertia, each plane driven by the slope's rate in the other:
    p·θz′ on θy and −p·θy′ on θz, p the polar inertia per length (Nelson and McVaugh 1976, from
    memory).
    """
    G = np.zeros((12, 12))
    phi = shear_ratio(section.EIz, section.GAy, length)
    N = _bending_mass(0.0, section.polar, length, phi)
    slopes = np.array([1.0, -1.0, 1.0, -1.0])  # θy is the negative slope of the x-z plane
    across = np.ix_((2, 4, 8, 10), (1, 5, 7, 11))
    G[across] = -(N * slopes[:, None])
    G[across[1].T, across[0].T] = (N * slopes[:, None]).T
    return G


def _bending_mass(mass: float, rotary: float, L: float, p: float) -> Floats:
    """(4, 4) on deflection and slope at each end; p is Φ."""
    a, b = 70 * p**2 + 147 * p + 78, (35 * p**2 + 77 * p + 44) * L / 4
    c, d = 35 * p**2 + 63 * p + 27, (35 * p**2 + 63 * p + 26) * L / 4
    e, f = (7 * p**2 + 14 * p + 8) * L**2 / 4, (7 * p**2 + 14 * p + 6) * L**2 / 4
    moving = np.array([[a, b, c, -d], [b, e, d, -f], [c, d, a, -b], [-d, -f, -b, e]])
    g, h = -(15 * p - 3) * L, (10 * p**2 + 5 * p + 4) * L**2
    i = (5 * p**2 - 5 * p - 1) * L**2
    turning = np.array([[36, g, -36, g], [g, h, -g, i], [-36, -g, 36, -g], [g, i, -g, h]])
    shifted: Floats = mass * L / (210 * (1 + p) ** 2) * moving
    turned: Floats = rotary / (30 * (1 + p) ** 2 * L) * turning
    return shifted + turned


def bending_half_wave(section: Section, frequency_hz: float) -> float:
    """Half a bending wave at `frequency_hz` in the softer plane, m: π(EI/mω²)^¼."""
    omega = 2 * np.pi * frequency_hz
    softer = min(section.EIy, section.EIz)
    return float(np.pi * (softer / (section.mass * omega**2)) ** 0.25)
