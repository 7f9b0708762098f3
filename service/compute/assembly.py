"""From a machine to its deformation rows and mass matrix.

Kinematics first: the deflection of a spring along its axis d, at the point p, is d·(u + θ × r) for
each end, r from the body's centre of mass to p (rigid arm, small rotations). Each scalar spring so
gives one row of J, and K = Jᵀ diag(k) J: the pieces ∂K/∂k = JᵢᵀJᵢ are kept, not only their sum.
Every rigid-body motion that the connections leave free is in the null space of J, whatever the
stiffnesses are.
"""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from service.compute.machine import (
    AXES,
    GROUND,
    Body,
    Floats,
    Integers,
    Link,
    Machine,
    Rotation,
    Spring,
    Vector,
)

Row = list[tuple[int, float]]


@dataclass(frozen=True, slots=True)
class Assembly:
    """A machine in the n motions that no body is held in.

    Attributes
    ----------
    names : BODY/MOTION per degree of freedom
    owners : (n,) index of the body that each degree of freedom belongs to
    axes : (n,) its axis, 0 to 5
    M : (n, n) mass matrix: kg, kg·m, kg·m²
    J : (m, n) deformation of each scalar spring per unit of motion: m/m, m/rad, rad/rad
    k, c, h : (m,) stiffness, viscous damping, imaginary part of stiffness of each
    springs_of : (m,) index into `connection_names`
    constraints : rows that must vanish, each with the name of its link
    places : (bodies, 3) centres of mass, m
    """

    names: tuple[str, ...]
    owners: Integers
    axes: Integers
    M: Floats
    J: Floats
    k: Floats
    c: Floats
    h: Floats
    springs_of: Integers
    constraints: tuple[tuple[str, Row], ...]
    body_names: tuple[str, ...]
    connection_names: tuple[str, ...]
    places: Floats


def assemble(machine: Machine) -> Assembly:
    """Number the motions, then write a row for every scalar spring and a block for every body."""
    numbers: list[dict[int, int]] = []
    names: list[str] = []
    owners: list[int] = []
    axes: list[int] = []
    for index, body in enumerate(machine.bodies):
        numbers.append({axis: len(names) + place for place, axis in enumerate(body.motions)})
        names.extend(f"{body.name}/{AXES[axis]}" for axis in body.motions)
        owners.extend([index] * len(body.motions))
        axes.extend(body.motions)
    rows = _Rows()
    index_of = {name: index for index, name in enumerate(machine.connection_names)}
    for spring in machine.springs:
        _spring_rows(spring, index_of[spring.name], machine.bodies, numbers, rows)
    size = len(names)
    return Assembly(
        names=tuple(names),
        owners=np.array(owners, dtype=int),
        axes=np.array(axes, dtype=int),
        M=_mass(machine.bodies, numbers, size),
        J=rows.matrix(size),
        k=np.array(rows.k),
        c=np.array(rows.c),
        h=np.array(rows.h),
        springs_of=np.array(rows.owner, dtype=int),
        constraints=tuple(
            constraint
            for link in machine.links
            for constraint in _link_rows(link, machine.bodies, numbers)
        ),
        body_names=tuple(body.name for body in machine.bodies),
        connection_names=machine.connection_names,
        places=np.array([body.at for body in machine.bodies], dtype=float),
    )


class _Rows:
    """Deformation rows as they are written down."""

    def __init__(self) -> None:
        self.at: list[int] = []
        self.column: list[int] = []
        self.value: list[float] = []
        self.k: list[float] = []
        self.c: list[float] = []
        self.h: list[float] = []
        self.owner: list[int] = []

    def add(self, row: Row, k: float, c: float, h: float, owner: int) -> None:
        number = len(self.k)
        for column, value in row:
            self.at.append(number)
            self.column.append(column)
            self.value.append(value)
        self.k.append(k)
        self.c.append(c)
        self.h.append(h)
        self.owner.append(owner)

    def matrix(self, size: int) -> Floats:
        J = np.zeros((len(self.k), size))
        J[self.at, self.column] = self.value
        return J


def _cross(r: Vector, d: Vector) -> Vector:
    return (r[1] * d[2] - r[2] * d[1], r[2] * d[0] - r[0] * d[2], r[0] * d[1] - r[1] * d[0])


def motion_along(body: Body, numbers: dict[int, int], point: Vector, axis: int, d: Vector) -> Row:
    """How far `point` of a body moves along `d` (or turns about it) per unit of its motions.

    d·(u + θ × r) = d·u + (r × d)·θ for a translation (`axis` < 3), d·θ for a rotation.
    """
    if axis >= 3:
        turning = d
        moving: Vector = (0.0, 0.0, 0.0)
    else:
        x, y, z = body.at
        turning = _cross((point[0] - x, point[1] - y, point[2] - z), d)
        moving = d
    entries = (*moving, *turning)
    return [(numbers[axis], entries[axis]) for axis in body.motions if entries[axis] != 0.0]


def _between(
    ends: tuple[int, int],
    bodies: tuple[Body, ...],
    numbers: list[dict[int, int]],
    point: Vector,
    axis: int,
    d: Vector,
) -> Row:
    """Motion of the second end less that of the first."""
    row: Row = []
    for end, sign in zip(ends, (-1.0, 1.0), strict=True):
        if end != GROUND:
            there = motion_along(bodies[end], numbers[end], point, axis, d)
            row.extend((column, sign * value) for column, value in there)
    return row


def _spring_rows(
    spring: Spring, owner: int, bodies: tuple[Body, ...], numbers: list[dict[int, int]], rows: _Rows
) -> None:
    damping = spring.damping or (0.0,) * 6
    for axis, (k, c) in enumerate(zip(spring.stiffness, damping, strict=True)):
        if k == 0.0 and c == 0.0:
            continue
        d = spring.axes[axis % 3]
        row = _between(spring.ends, bodies, numbers, spring.at, axis, d)
        if row:
            rows.add(row, k, c, k * spring.loss_factor, owner)


def _link_rows(
    link: Link, bodies: tuple[Body, ...], numbers: list[dict[int, int]]
) -> Iterator[tuple[str, Row]]:
    for axis in link.axes:
        row = _between(link.ends, bodies, numbers, link.at, axis, _UNIT[axis % 3])
        if row:
            yield link.name, row


_UNIT: Rotation = ((1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0))


def _mass(bodies: tuple[Body, ...], numbers: list[dict[int, int]], size: int) -> Floats:
    """Block diagonal: mass in the translations, the inertia tensor in the rotations."""
    M = np.zeros((size, size))
    for body, number in zip(bodies, numbers, strict=True):
        xx, yy, zz, xy, yz, xz = body.inertia
        tensor = ((xx, xy, xz), (xy, yy, yz), (xz, yz, zz))
        turning = [axis for axis in body.motions if axis >= 3]
        for axis in body.motions:
            if axis < 3:
                M[number[axis], number[axis]] = body.mass
        for axis in turning:
            for other in turning:
                M[number[axis], number[other]] = tensor[axis - 3][other - 3]
    return M
