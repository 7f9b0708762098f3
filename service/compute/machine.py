"""A machine as the assembly takes it: bodies, the parts between them, all in SI.

Axes are numbered 0 to 5 for x, y, z, rx, ry, rz. Ends of a part are indices of bodies; -1 is
ground.
"""

from dataclasses import dataclass, replace
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

Floats: TypeAlias = NDArray[np.float64]
Integers: TypeAlias = NDArray[np.intp]
Shapes: TypeAlias = NDArray[np.inexact[Any]]  # real, or complex where damped
Vector: TypeAlias = tuple[float, float, float]
Rotation: TypeAlias = tuple[Vector, Vector, Vector]

AXES = ("x", "y", "z", "rx", "ry", "rz")
GROUND = -1
UPRIGHT: Rotation = ((1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0))


class Unsound(ValueError):
    """A machine that can't be computed, and the part that is at fault.

    Parameters
    ----------
    detail : what is wrong
    part : where: ("body", name), ("connection", name), ("mass", row, column), ...
    """

    def __init__(self, detail: str, *part: str | int) -> None:
        super().__init__(detail)
        self.detail = detail
        self.part = part


@dataclass(frozen=True, slots=True)
class Spin:
    """Turns about `axis` (0 to 2) at `ratio` times the speed of the machine's shaft."""

    axis: int
    ratio: float


@dataclass(frozen=True, slots=True)
class Body:
    """A rigid body with its centre of mass at `at` (m), `mass` (kg) and inertia tensor (kg·m²).

    `inertia` is (xx, yy, zz, xy, yz, xz) about the centre of mass. `able` are the axes in which it
    can move, `motions` those of them that aren't held.
    """

    name: str
    at: Vector
    mass: float
    inertia: tuple[float, ...]
    motions: tuple[int, ...]
    able: tuple[int, ...]
    spin: Spin | None = None


@dataclass(frozen=True, slots=True)
class Spring:
    """Springs and dampers along and about up to six axes at one point of space.

    `axes` holds the part's own x, y, z as rows. `stiffness` (N/m, N·m/rad) and `damping` (N·s/m,
    N·m·s/rad) are per own axis, `loss_factor` is the imaginary part of stiffness over the real.
    """

    name: str
    ends: tuple[int, int]
    at: Vector
    stiffness: tuple[float, ...]
    damping: tuple[float, ...] = ()
    loss_factor: float = 0.0
    axes: Rotation = UPRIGHT


@dataclass(frozen=True, slots=True)
class Link:
    """A rigid tie at a point of space, in the motions `axes`."""

    name: str
    ends: tuple[int, int]
    at: Vector
    axes: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Flywheel:
    """Inertia (kg·m²) about the direction `about` that a connection adds to a body."""

    name: str
    body: int
    about: Vector
    inertia: float


@dataclass(frozen=True, slots=True)
class Gear:
    """θ₂ = ratio·θ₁ for rotations given as (body, axis).

    Exact where `stiffness` is None; else the spring k(r₂(θ₂ − ratio·θ₁))² acts, `radius` r₂ in m.
    """

    name: str
    driver: tuple[int, int]
    driven: tuple[int, int]
    ratio: float
    stiffness: float | None = None
    radius: float = 1.0


@dataclass(frozen=True, slots=True)
class Section:
    """Stiffness and mass of a beam per unit of length, in its own axes.

    Attributes
    ----------
    EA : N; GJ, EIy, EIz : N·m²
    GAy, GAz : shear stiffness in y and z, N (infinite without shear deformation)
    mass : kg/m
    polar : rotary inertia about the beam's axis, kg·m
    Iy, Iz : rotary inertia about the section's y and z, kg·m (0 where neglected)
    """

    EA: float
    GJ: float
    EIy: float
    EIz: float
    GAy: float
    GAz: float
    mass: float
    polar: float
    Iy: float
    Iz: float


@dataclass(frozen=True, slots=True)
class Beam:
    """A beam between two bodies, cut into equal elements.

    `axes` holds its own x (from the first end to the second), y and z as rows; `tension` is in N.
    """

    name: str
    ends: tuple[int, int]
    elements: int
    axes: Rotation
    section: Section
    tension: float = 0.0
    spin_ratio: float = 0.0


@dataclass(frozen=True, slots=True)
class Bearing:
    """Coefficients in two directions across a shaft, constant or over its speed.

    Attributes
    ----------
    directions : the two lateral directions
    rpm : (p,) speeds, ascending
    stiffness, damping : (p, 2, 2), N/m and N·s/m, not always symmetric
    """

    name: str
    ends: tuple[int, int]
    at: Vector
    directions: tuple[Vector, Vector]
    rpm: Floats
    stiffness: Floats
    damping: Floats

    def coefficients(self, rpm: float) -> tuple[Floats, Floats]:
        """(2, 2) stiffness and damping at `rpm`: linear in speed, constant outside the table."""
        place = float(np.interp(rpm, self.rpm, np.arange(len(self.rpm))))
        low = min(int(place), len(self.rpm) - 1)
        high = min(low + 1, len(self.rpm) - 1)
        share = place - low
        K = (1.0 - share) * self.stiffness[low] + share * self.stiffness[high]
        C = (1.0 - share) * self.damping[low] + share * self.damping[high]
        return K, C

    def elastic(self) -> "Bearing":
        """The same bearing without damping and without cross-coupling that feeds energy in."""
        symmetric = (self.stiffness + self.stiffness.transpose(0, 2, 1)) / 2
        return replace(self, stiffness=symmetric, damping=np.zeros_like(self.damping))

    def covers(self, rpm: float) -> bool:
        """Whether the table reaches `rpm`; a constant set reaches everywhere."""
        return len(self.rpm) == 1 or bool(self.rpm[0] <= rpm <= self.rpm[-1])


@dataclass(frozen=True, slots=True)
class Machine:
    """Bodies, and the parts between them."""

    bodies: tuple[Body, ...]
    springs: tuple[Spring, ...] = ()
    links: tuple[Link, ...] = ()
    gears: tuple[Gear, ...] = ()
    flywheels: tuple[Flywheel, ...] = ()
    beams: tuple[Beam, ...] = ()
    bearings: tuple[Bearing, ...] = ()
    connection_names: tuple[str, ...] = ()
