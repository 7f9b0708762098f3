"""From a machine to its deformation rows and mass matrix.

Kinematics first: the deflection of a spring along its axis d, at the point p, is d·(u + θ × r) for
each end, r from the body's centre of mass to p (rigid arm, small rotations). Each scalar spring so
gives one row of J, and K = Jᵀ diag(k) J: the pieces ∂K/∂k = JᵢᵀJᵢ are kept, not only their sum.
Every rigid-body motion that the connections leave free is in the null space of J, whatever the
stiffnesses are.
"""

from collections.abc import Iterator
from dataclasses import dataclass, replace
from itertools import pairwise
from typing import Any, TypeAlias

import numpy as np
from scipy.sparse import csr_array

from service.compute import beams
from service.compute.machine import (
    AXES,
    GROUND,
    UPRIGHT,
    Beam,
    Bearing,
    Body,
    Floats,
    Gear,
    Integers,
    Link,
    Machine,
    Spin,
    Spring,
    Vector,
)

Row = list[tuple[int, float]]
Matrix: TypeAlias = Any  # an ndarray, or a scipy.sparse array where there are many motions
DENSE_UP_TO = 1500  # motions; above, J and M are kept sparse


@dataclass(frozen=True, slots=True)
class Assembly:
    """A machine in the n motions that no body is held in.

    Attributes
    ----------
    names : BODY/MOTION per degree of freedom, inner points of beams last
    owners : (n,) index into `points` of what each degree of freedom belongs to
    axes : (n,) its axis, 0 to 5
    M : (n, n) mass matrix: kg, kg·m, kg·m²
    J : (m, n) deformation of each scalar spring per unit of motion: m/m, m/rad, rad/rad
    k, c, h : (m,) stiffness, viscous damping, imaginary part of stiffness of each
    springs_of : (m,) index into `connection_names`
    masses : entries of M, each with what it belongs to: an index into `carriers`
    carriers : names of what has mass: bodies, then connections
    G : (n, n) gyroscopic matrix per rad/s of shaft speed: kg·m²; None where nothing spins
    bearings : bearings, each with its two rows of deformation (2, n)
    constraints : rows that must vanish, each with the name of its link or gear
    points : names of bodies and of inner points of beams; places : (points, 3), m
    bodies : how many of the points are bodies
    """

    names: tuple[str, ...]
    owners: Integers
    axes: Integers
    M: Matrix
    J: Matrix
    k: Floats
    c: Floats
    h: Floats
    springs_of: Integers
    masses: "Entries"
    G: Matrix | None
    bearings: tuple[tuple[Bearing, Matrix], ...]
    constraints: tuple[tuple[str, Row], ...]
    points: tuple[str, ...]
    places: Floats
    bodies: int
    connection_names: tuple[str, ...]

    @property
    def carriers(self) -> tuple[str, ...]:
        """What has mass: bodies, then connections."""
        return self.points[: self.bodies] + self.connection_names


@dataclass(frozen=True, slots=True)
class Entries:
    """Entries of a matrix, some of which may stand at the same place: they add up."""

    row: Integers
    column: Integers
    value: Floats
    owner: Integers

    def matrix(self, rows: int, columns: int) -> Matrix:
        """Dense up to `DENSE_UP_TO` columns, sparse above."""
        if columns > DENSE_UP_TO:
            return csr_array((self.value, (self.row, self.column)), shape=(rows, columns))
        flat = self.row * columns + self.column
        dense = np.bincount(flat, self.value, rows * columns).astype(float)
        return dense.reshape(rows, columns)


def assemble(machine: Machine) -> Assembly:
    """Number the motions, then write a row for every scalar spring and a block for every mass."""
    inner = [point for beam in machine.beams for point in _inner_points(beam, machine.bodies)]
    points = (*machine.bodies, *inner)
    builder = _Builder(points, {name: i for i, name in enumerate(machine.connection_names)})
    for index, body in enumerate(machine.bodies):
        builder.body(index, body)
    for spring in machine.springs:
        builder.spring(spring)
    for flywheel in machine.flywheels:
        owner = len(machine.bodies) + builder.number_of[flywheel.name]
        row = builder.motion(flywheel.body, points[flywheel.body].at, 3, flywheel.about)
        _outer(builder.masses, row, row, flywheel.inertia, owner)
    for gear in machine.gears:
        if gear.stiffness is not None:
            row = builder.gear(gear)
            builder.row(row, gear.stiffness * gear.radius**2, 0.0, 0.0, gear.name)
    first = len(machine.bodies)
    for beam in machine.beams:
        owner = len(machine.bodies) + builder.number_of[beam.name]
        inside = range(first, first + beam.elements - 1)
        builder.beam(beam, (beam.ends[0], *inside, beam.ends[1]), owner)
        first += beam.elements - 1
    size = len(builder.names)
    masses = builder.masses.entries()
    return Assembly(
        names=tuple(builder.names),
        owners=np.array(builder.owners, dtype=int),
        axes=np.array(builder.axes, dtype=int),
        M=masses.matrix(size, size),
        J=builder.rows.entries().matrix(len(builder.k), size),
        k=np.array(builder.k),
        c=np.array(builder.c),
        h=np.array(builder.h),
        springs_of=np.array(builder.springs_of, dtype=int),
        masses=masses,
        G=builder.gyroscopic.entries().matrix(size, size) if builder.gyroscopic.row else None,
        bearings=tuple((bearing, builder.bearing(bearing)) for bearing in machine.bearings),
        constraints=tuple(builder.constraints(machine.links, machine.gears)),
        points=tuple(point.name for point in points),
        places=np.array([point.at for point in points], dtype=float),
        bodies=len(machine.bodies),
        connection_names=machine.connection_names,
    )


def _inner_points(beam: Beam, bodies: tuple[Body, ...]) -> Iterator[Body]:
    """Massless points inside a beam, NAME.1 and on, with the motions of either of its ends."""
    first, second = (bodies[end] for end in beam.ends)
    motions = tuple(sorted({*first.able, *second.able}))
    for number in range(1, beam.elements):
        share = number / beam.elements
        x, y, z = ((1.0 - share) * a + share * b for a, b in zip(first.at, second.at, strict=True))
        yield replace(
            first,
            name=f"{beam.name}.{number}",
            at=(x, y, z),
            mass=0.0,
            inertia=(0.0,) * 6,
            motions=motions,
            able=motions,
        )


class _Triplets:
    """Entries of a matrix as they are written down."""

    def __init__(self) -> None:
        self.row: list[int] = []
        self.column: list[int] = []
        self.value: list[float] = []
        self.owner: list[int] = []

    def add(self, row: int, column: int, value: float, owner: int) -> None:
        self.row.append(row)
        self.column.append(column)
        self.value.append(value)
        self.owner.append(owner)

    def entries(self) -> Entries:
        return Entries(
            np.array(self.row, dtype=int),
            np.array(self.column, dtype=int),
            np.array(self.value, dtype=float),
            np.array(self.owner, dtype=int),
        )


def _outer(entries: _Triplets, first: Row, second: Row, value: float, owner: int) -> None:
    """`value` times the outer product of two rows."""
    for row, a in first:
        for column, b in second:
            entries.add(row, column, value * a * b, owner)


def _cross(r: Vector, d: Vector) -> Vector:
    return (r[1] * d[2] - r[2] * d[1], r[2] * d[0] - r[0] * d[2], r[0] * d[1] - r[1] * d[0])


def _sorted_sum(row: Row) -> Row:
    """One entry for each motion."""
    sums: dict[int, float] = {}
    for column, value in row:
        sums[column] = sums.get(column, 0.0) + value
    return list(sums.items())


class _Builder:
    """Numbers the motions of all points and writes down what acts on them."""

    def __init__(self, points: tuple[Body, ...], number_of: dict[str, int]) -> None:
        self.points = points
        self.number_of = number_of
        self.numbers: list[dict[int, int]] = []
        self.names: list[str] = []
        self.owners: list[int] = []
        self.axes: list[int] = []
        for index, point in enumerate(points):
            first = len(self.names)
            self.numbers.append({axis: first + i for i, axis in enumerate(point.motions)})
            self.names.extend(f"{point.name}/{AXES[axis]}" for axis in point.motions)
            self.owners.extend([index] * len(point.motions))
            self.axes.extend(point.motions)
        self.rows, self.masses, self.gyroscopic = _Triplets(), _Triplets(), _Triplets()
        self.k: list[float] = []
        self.c: list[float] = []
        self.h: list[float] = []
        self.springs_of: list[int] = []

    def row(self, row: Row, k: float, c: float, h: float, name: str) -> None:
        """A scalar spring that `row` deforms."""
        if not row:
            return
        number = len(self.k)
        for column, value in row:
            self.rows.add(number, column, value, number)
        self.k.append(k)
        self.c.append(c)
        self.h.append(h)
        self.springs_of.append(self.number_of[name])

    def motion(self, index: int, place: Vector, axis: int, d: Vector) -> Row:
        """How far `place` on a point moves along `d`, or turns about it, per unit of its motions.

        d·(u + θ × r) = d·u + (r × d)·θ for a translation (`axis` < 3), d·θ for a rotation.
        """
        point, numbers = self.points[index], self.numbers[index]
        if axis >= 3:
            entries = (0.0, 0.0, 0.0, *d)
        else:
            x, y, z = point.at
            entries = (*d, *_cross((place[0] - x, place[1] - y, place[2] - z), d))
        return [(numbers[own], entries[own]) for own in point.motions if entries[own] != 0.0]

    def between(self, ends: tuple[int, int], place: Vector, axis: int, d: Vector) -> Row:
        """Motion of the second end less that of the first."""
        row: Row = []
        for end, sign in zip(ends, (-1.0, 1.0), strict=True):
            if end != GROUND:
                there = self.motion(end, place, axis, d)
                row.extend((column, sign * value) for column, value in there)
        return row

    def body(self, index: int, body: Body) -> None:
        """Mass in the translations, the inertia tensor in the rotations."""
        numbers = self.numbers[index]
        xx, yy, zz, xy, yz, xz = body.inertia
        tensor = ((xx, xy, xz), (xy, yy, yz), (xz, yz, zz))
        turning = [axis for axis in body.motions if axis >= 3]
        for axis in body.motions:
            if axis < 3 and body.mass != 0.0:
                self.masses.add(numbers[axis], numbers[axis], body.mass, index)
        for axis in turning:
            for other in turning:
                value = tensor[axis - 3][other - 3]
                if value != 0.0:
                    self.masses.add(numbers[axis], numbers[other], value, index)

        if body.spin is not None:
            self._spinning(index, body, body.spin)

    def _spinning(self, index: int, body: Body, spin: Spin) -> None:
        """I·θ″ + Iₚ·ω·(θ′ × e): the rate of the angular momentum Iₚω(e + θ × e)."""
        numbers = self.numbers[index]
        first, second = 3 + (spin.axis + 1) % 3, 3 + (spin.axis + 2) % 3
        if first in numbers and second in numbers:
            momentum = body.inertia[spin.axis] * spin.ratio
            self.gyroscopic.add(numbers[first], numbers[second], momentum, index)
            self.gyroscopic.add(numbers[second], numbers[first], -momentum, index)

    def bearing(self, bearing: Bearing) -> Matrix:
        """(2, n) how far a bearing's second end moves from its first, laterally."""
        rows = _Triplets()
        for number, d in enumerate(bearing.directions):
            for column, value in self.between(bearing.ends, bearing.at, 0, d):
                rows.add(number, column, value, number)
        return rows.entries().matrix(2, len(self.names))

    def spring(self, spring: Spring) -> None:
        """A row for each axis that has stiffness or damping."""
        damping = spring.damping or (0.0,) * 6
        for axis, (k, c) in enumerate(zip(spring.stiffness, damping, strict=True)):
            if k != 0.0 or c != 0.0:
                row = self.between(spring.ends, spring.at, axis, spring.axes[axis % 3])
                self.row(row, k, c, k * spring.loss_factor, spring.name)

    def gear(self, gear: Gear) -> Row:
        """θ₂ − ratio·θ₁."""
        row: Row = []
        for (body, axis), factor in ((gear.driven, 1.0), (gear.driver, -gear.ratio)):
            if axis in self.numbers[body]:
                row.append((self.numbers[body][axis], factor))
        return row

    def constraints(
        self, links: tuple[Link, ...], gears: tuple[Gear, ...]
    ) -> Iterator[tuple[str, Row]]:
        """The rows of links and exact gears that must vanish."""
        for link in links:
            for axis in link.axes:
                row = self.between(link.ends, link.at, axis, UPRIGHT[axis % 3])
                if row:
                    yield link.name, row
        for gear in gears:
            row = self.gear(gear)
            if gear.stiffness is None and row:
                yield gear.name, row

    def beam(self, beam: Beam, nodes: tuple[int, ...], owner: int) -> None:
        """Rows and consistent mass of each element."""
        first, last = (np.array(self.points[end].at) for end in beam.ends)
        length = float(np.linalg.norm(last - first)) / beam.elements
        parts = list(beams.deformations(beam.section, length, beam.tension))
        mass = beams.mass(beam.section, length)
        whirl = beam.spin_ratio * beams.gyroscopic(beam.section, length)
        for pair in pairwise(nodes):
            own = [
                self.motion(node, self.points[node].at, axis, beam.axes[axis % 3])
                for node in pair
                for axis in range(6)
            ]
            for part in parts:
                row = [
                    (column, factor * value)
                    for factor, motion in zip((*part.first, *part.second), own, strict=True)
                    if factor != 0.0
                    for column, value in motion
                ]
                self.row(_sorted_sum(row), part.k, 0.0, 0.0, beam.name)
            for matrix, entries in ((mass, self.masses), (whirl, self.gyroscopic)):
                for i, j in zip(*(index.tolist() for index in np.nonzero(matrix)), strict=True):
                    _outer(entries, own[i], own[j], float(matrix[i, j]), owner)
