"""A machine seen with its ground: what the ground's motion does to it, and what parts carry.

Every body, and the ground too, is given all six motions. Each connection then has its whole
deformation in one row of J,

    δ = J_q·q + J_g·u,

q the motions of the machine, u a motion of the ground, which takes with it whatever is held. Forces
and moments that a connection carries are the same row turned round: −J_eᵀs on its end e.
"""

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from service.compute.assembly import Assembly, assemble
from service.compute.machine import (
    AXES,
    GROUND,
    Bearing,
    Body,
    Floats,
    Integers,
    Machine,
    Unsound,
    Vector,
)

GROUND_NAME = "ground"
FITS = 1e-9  # of the row's size: a tie that rigid motion leaves alone


@dataclass(frozen=True, slots=True)
class SpaceMachine:
    """A machine in space, all points with six motions, the ground as its last body.

    Attributes
    ----------
    machine : the machine as it was given
    whole : the assembly with ground
    own : (n,) columns of the machine's own motions
    about : the point that the ground turns about
    levers : lengths of pendulums by name, m
    """

    machine: Machine
    whole: Assembly
    own: Integers
    about: Vector
    levers: dict[str, float]

    def field(self, axis: int) -> Floats:
        """(columns,) motion of every point and of the ground, moving rigidly about `axis`."""
        arms = (self.whole.places - np.array(self.about))[self.whole.owners]
        return rigid_motion(self.whole.axes, arms, axis)

    def imposed(self, axis: int) -> Floats:
        """(columns,) what of that motion the ground imposes: its own, and that of what is held."""
        field = self.field(axis)
        imposed = np.zeros_like(field)
        place = {name: column for column, name in enumerate(self.whole.names)}
        for body in self.machine.bodies:
            for held in set(body.able) - set(body.motions):
                column = place[f"{body.name}/{AXES[held]}"]
                imposed[column] = field[column]
        for number in range(6):
            column = place[f"{GROUND_NAME}/{AXES[number]}"]
            imposed[column] = field[column]
        return imposed

    def scalar_rows(self, axis: int | None) -> tuple[Floats, Floats]:
        """(m, n) deformation rows in the machine's motions, and (m,) by the ground's motion."""
        J = self.whole.J
        if axis is None:
            return J[:, self.own], np.zeros(len(self.whole.k))
        imposed = self.imposed(axis)
        ground = J @ imposed
        ground = ground + self._pendulums(axis) + self._meshes(axis)
        return J[:, self.own], ground

    def bearing_rows(self, axis: int | None) -> list[tuple[Bearing, Floats, Floats]]:
        """Bearings with their two rows in the machine's motions, and by the ground's motion."""
        none = np.zeros(len(self.whole.names))
        imposed = none if axis is None else self.imposed(axis)
        return [(b, rows[:, self.own], rows @ imposed) for b, rows in self.whole.bearings]

    def named(self, name: str) -> Integers:
        """Rows of one connection."""
        number = self.whole.connection_names.index(name)
        return np.flatnonzero(self.whole.springs_of == number)

    def _pendulums(self, axis: int) -> Floats:
        """A pendulum's fixed point lies above its body: turning the ground moves it by the lever.

        The rows of a pendulum are written at the body; −1·(θ × lever) is what they lack.
        """
        extra = np.zeros(len(self.whole.k))
        for name, length in self.levers.items():
            for row, about, sign in zip(self.named(name).tolist(), (4, 3), (-1, 1), strict=False):
                extra[row] += sign * length * (axis == about)
        return extra

    def _meshes(self, axis: int) -> Floats:
        """Wheels turn against their housing, which turns with the ground."""
        extra = np.zeros(len(self.whole.k))
        for gear in self.machine.gears:
            if gear.stiffness is not None:
                (row,) = self.named(gear.name).tolist()
                extra[row] = gear.ratio * (axis == gear.driver[1]) - (axis == gear.driven[1])
        return extra

    def carried(self, axis: int) -> Floats | None:
        """(n,) particular motion that rigid ties to moving ground ask for; None where none does.

        Raises
        ------
        Unsound
            A rigid tie doesn't let the machine move with its ground.
        """
        field, imposed = self.field(axis), self.imposed(axis)
        asked = False
        for name, row in self.whole.constraints:
            columns = [column for column, _ in row]
            values = np.array([value for _, value in row])
            housing = self._housing(name, axis)
            asked = asked or abs(float(values @ imposed[columns]) + housing) > 0.0
            rest = np.isin(columns, self.own)
            moved = values @ np.where(rest, field[columns], imposed[columns]) + housing
            if abs(moved) > FITS * np.abs(values).sum() * max(1.0, np.abs(field).max()):
                raise Unsound(
                    "this rigid tie and the ground's motion contradict each other",
                    "connection",
                    name,
                )
        return field[self.own] if asked else None

    def _housing(self, name: str, axis: int) -> float:
        for gear in self.machine.gears:
            if gear.name == name and gear.stiffness is None:
                return gear.ratio * (axis == gear.driver[1]) - float(axis == gear.driven[1])
        return 0.0


def rigid_motion(axes: Integers, arms: Floats, axis: int) -> Floats:
    """(n,) motions of points of one rigid body that moves along or turns about `axis` (0 to 5).

    Parameters
    ----------
    axes : (n,) axis of each motion
    arms : (n, 3) from the point turned about, m
    """
    motion: Floats = (axes == axis).astype(float)
    if axis >= 3:
        shifts = np.cross(np.eye(3)[axis - 3], arms)
        along = axes < 3
        motion[along] = shifts[along, axes[along]]
    return motion


def space_machine(
    machine: Machine, names: tuple[str, ...], levers: dict[str, float], about: Vector
) -> SpaceMachine:
    """The machine with ground and all motions in space.

    Parameters
    ----------
    names : BODY/MOTION of the machine's own n motions
    levers : lengths of pendulums by name, m
    about : the point that the ground turns about, m
    """
    every = tuple(range(6))
    bodies = [replace(body, motions=every, able=every, spin=None) for body in machine.bodies]
    ground = Body(GROUND_NAME, about, 0.0, (0.0,) * 6, every, every)
    last = len(bodies)
    parts: dict[str, Any] = {
        field: tuple(_grounded(part, last) for part in getattr(machine, field))
        for field in ("springs", "links", "bearings")
    }
    whole = assemble(replace(machine, bodies=(*bodies, ground), **parts))
    place = {name: column for column, name in enumerate(whole.names)}
    own = np.array([place[name] for name in names], dtype=int)
    return SpaceMachine(machine, whole, own, about, levers)


def _grounded(part: Any, last: int) -> Any:
    first, second = (last if end == GROUND else end for end in part.ends)
    return replace(part, ends=(first, second))
