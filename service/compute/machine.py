"""A machine as the assembly takes it: bodies, the parts between them, all in SI.

Axes are numbered 0 to 5 for x, y, z, rx, ry, rz. Ends of a part are indices of bodies; -1 is
ground.
"""

from dataclasses import dataclass, field
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

Floats: TypeAlias = NDArray[np.float64]
Integers: TypeAlias = NDArray[np.intp]
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
class Body:
    """A rigid body with its centre of mass at `at` (m), `mass` (kg) and inertia tensor (kg·m²).

    `inertia` is (xx, yy, zz, xy, yz, xz) about the centre of mass. `motions` are the axes in
    which it can move, without those that are held.
    """

    name: str
    at: Vector
    mass: float
    inertia: tuple[float, float, float, float, float, float]
    motions: tuple[int, ...]


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
class Machine:
    """Bodies, and the parts between them."""

    bodies: tuple[Body, ...]
    springs: tuple[Spring, ...] = ()
    links: tuple[Link, ...] = ()
    connection_names: tuple[str, ...] = field(default=())
