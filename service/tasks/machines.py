"""From a posted system to what compute works on, and from its complaints back to a place in it."""

from dataclasses import dataclass

import numpy as np

from schemas.faults import Fault, Invalid, pointer
from schemas.quantities import MOTIONS, split_degree_of_freedom
from schemas.system import (
    AnySystem,
    BodiesSystem,
    Body,
    Damper,
    DampingPerAxis,
    InertiaTensor,
    Link,
    MatricesSystem,
    Pendulum,
    Spring,
    StiffnessPerAxis,
)
from service.compute import machine as m
from service.compute.assembly import Assembly, assemble
from service.compute.participation import support_motions
from service.compute.pencil import Pencil, pencil_of, pencil_of_matrices

NUMBER_OF = {motion: number for number, motion in enumerate(MOTIONS)}
SYMMETRIC_WITHIN = 1e-9  # of the larger of the two entries: what printing and reading may lose


@dataclass(frozen=True, slots=True)
class Analysed:
    """A system made ready to be solved.

    Attributes
    ----------
    names : BODY/MOTION per degree of freedom, n of them
    owners, axes : (n,) index into `bodies`, and axis 0 to 5
    M : (n, n) mass matrix
    pencil : what is solved
    directions : axes of the rigid-body motions of the supports, and those motions (n, d)
    assembly : the deformation rows, None for explicit matrices
    """

    names: tuple[str, ...]
    owners: m.Integers
    axes: m.Integers
    bodies: tuple[str, ...]
    M: m.Floats
    pencil: Pencil
    directions: tuple[list[int], m.Floats]
    assembly: Assembly | None


def degrees_of_freedom(system: AnySystem) -> int:
    """How many motions the system has that aren't held (no unit)."""
    if isinstance(system, MatricesSystem):
        return len(system.degrees_of_freedom)
    return sum(len(set(body.motions or ()) - set(body.held)) for body in system.bodies)


def analyse(system: AnySystem) -> Analysed:
    """Assemble and reduce a system.

    Raises
    ------
    Invalid
        The system can't be computed; pointers start at the system.
    """
    try:
        if isinstance(system, BodiesSystem):
            return _of_bodies(system)
        return _of_matrices(system)
    except m.Unsound as fault:
        raise Invalid([Fault(_place(system, fault.part), fault.detail)]) from None


def _of_bodies(system: BodiesSystem) -> Analysed:
    assembly = assemble(machine_of(system))
    return Analysed(
        assembly.names,
        assembly.owners,
        assembly.axes,
        assembly.body_names,
        assembly.M,
        pencil_of(assembly),
        support_motions(assembly),
        assembly,
    )


def _of_matrices(system: MatricesSystem) -> Analysed:
    faults: list[Fault] = []
    M = _symmetric(system.mass, "mass", faults)
    K = _symmetric(system.stiffness, "stiffness", faults)
    if faults:
        raise Invalid(faults)
    split = [split_degree_of_freedom(name) for name in system.degrees_of_freedom]
    pairs = [pair for pair in split if pair is not None]
    bodies = tuple(dict.fromkeys(body for body, _ in pairs))
    index = {body: number for number, body in enumerate(bodies)}
    axes = np.array([NUMBER_OF[motion] for _, motion in pairs])
    names = tuple(system.degrees_of_freedom)
    present = sorted(set(axes.tolist()))
    return Analysed(
        names,
        np.array([index[body] for body, _ in pairs]),
        axes,
        bodies,
        M,
        pencil_of_matrices(K, M, names),
        (present, (axes[:, None] == present).astype(float)),
        None,
    )


def _symmetric(rows: list[list[float]], field: str, faults: list[Fault]) -> m.Floats:
    """The matrix with both triangles averaged; a fault names the entry that is off the most."""
    A = np.array(rows)
    difference = np.abs(A - A.T)
    allowed = SYMMETRIC_WITHIN * np.maximum(np.abs(A), np.abs(A.T))
    over = difference - allowed
    if (over > 0.0).any():
        row, column = (int(i) for i in np.unravel_index(over.argmax(), over.shape))
        faults.append(
            Fault(
                pointer((field, row, column)),
                f"not symmetric: {A[row, column]:.9g} here, {A[column, row]:.9g} in row {column}, "
                f"column {row}",
            )
        )
    symmetric: m.Floats = (A + A.T) / 2
    return symmetric


def _place(system: AnySystem, part: tuple[str | int, ...]) -> str:
    """A pointer into the system to the part that compute complains of."""
    kind, *rest = part
    if isinstance(system, MatricesSystem):
        if kind == "degree of freedom":
            return pointer(("degrees_of_freedom", system.degrees_of_freedom.index(str(rest[0]))))
        return pointer(part) if kind == "mass" else "/mass"
    if kind == "degree of freedom":
        body = str(rest[0]).rpartition("/")[0]
        return pointer(("bodies", [item.name for item in system.bodies].index(body)))
    return "/bodies"


def machine_of(system: BodiesSystem) -> m.Machine:
    """The posted bodies and connections as the assembly takes them."""
    places = {body.name: index for index, body in enumerate(system.bodies)}
    springs: list[m.Spring] = []
    links: list[m.Link] = []
    for connection in system.connections:
        if isinstance(connection, Spring):
            springs.append(_spring(connection, system, places))
        elif isinstance(connection, Damper):
            springs.append(_damper(connection, system, places))
        elif isinstance(connection, Pendulum):
            springs.append(_pendulum(connection, system, places))
        else:
            links.append(_link(connection, system, places))
    return m.Machine(
        bodies=tuple(_body(body) for body in system.bodies),
        springs=tuple(springs),
        links=tuple(links),
        connection_names=tuple(connection.name for connection in system.connections),
    )


def _vector(point: list[float]) -> m.Vector:
    return (point[0], point[1], point[2])


def _body(body: Body) -> m.Body:
    motions = [motion for motion in body.motions or () if motion not in body.held]
    return m.Body(
        body.name,
        _vector(body.at),
        body.mass,
        _tensor(body),
        tuple(NUMBER_OF[motion] for motion in motions),
    )


def _tensor(body: Body) -> tuple[float, float, float, float, float, float]:
    inertia = body.inertia
    if isinstance(inertia, InertiaTensor):
        return (inertia.xx, inertia.yy, inertia.zz, inertia.xy, inertia.yz, inertia.xz)
    about = [motion for motion in body.motions or () if motion[0] == "r"]
    xx, yy, zz = (inertia or 0.0 if axis in about else 0.0 for axis in ("rx", "ry", "rz"))
    return (xx, yy, zz, 0.0, 0.0, 0.0)


def _ends(between: list[str], places: dict[str, int]) -> tuple[int, int]:
    first, second = (places.get(end, m.GROUND) for end in between)
    return first, second


def _six(value: StiffnessPerAxis | DampingPerAxis | float | None, axis: int) -> tuple[float, ...]:
    if value is None:
        return (0.0,) * 6
    if isinstance(value, StiffnessPerAxis | DampingPerAxis):
        return (value.x, value.y, value.z, value.rx, value.ry, value.rz)
    return tuple(value if number == axis else 0.0 for number in range(6))


def _only_axis(part: Spring | Damper, system: BodiesSystem, places: dict[str, int]) -> int:
    """Where a single number acts: along `along` (then the part's own x), or the only motion."""
    if part.along is not None:
        return 0
    ends = [system.bodies[places[end]] for end in part.between if end in places]
    motions = sorted(NUMBER_OF[motion] for body in ends for motion in body.motions or ())
    return motions[0] if motions else 0


def _own_axes(part: Spring | Damper) -> m.Rotation:
    """The part's own x, y, z as rows."""
    if part.along is not None:
        length = float(np.linalg.norm(part.along))
        own = _vector([value / length for value in part.along])
        return (own, own, own)
    if part.axes is None:
        return m.UPRIGHT
    first, second, third = (_vector(list(column)) for column in zip(*part.axes, strict=True))
    rows = (first, second, third)
    if all(abs(_dot(p, q) - (p is q)) < 1e-14 for p in rows for q in rows):
        return rows
    return _nearest_rotation(part.axes)


def _dot(p: m.Vector, q: m.Vector) -> float:
    return p[0] * q[0] + p[1] * q[1] + p[2] * q[2]


def _nearest_rotation(axes: list[list[float]]) -> m.Rotation:
    """For axes read off a drawing: the orthogonal factor of the polar decomposition, as rows."""
    left, _, right = np.linalg.svd(axes)
    first, second, third = (left @ right).T.tolist()
    return (_vector(first), _vector(second), _vector(third))


def _at(part: Spring | Damper | Link) -> m.Vector:
    return _vector(part.at or [0.0, 0.0, 0.0])


def _spring(spring: Spring, system: BodiesSystem, places: dict[str, int]) -> m.Spring:
    axis = _only_axis(spring, system, places)
    return m.Spring(
        spring.name,
        _ends(spring.between, places),
        _at(spring),
        _six(spring.stiffness, axis),
        _six(spring.damping, axis),
        spring.loss_factor or 0.0,
        _own_axes(spring),
    )


def _damper(damper: Damper, system: BodiesSystem, places: dict[str, int]) -> m.Spring:
    axis = _only_axis(damper, system, places)
    return m.Spring(
        damper.name,
        _ends(damper.between, places),
        _at(damper),
        (0.0,) * 6,
        _six(damper.damping, axis),
        axes=_own_axes(damper),
    )


def _pendulum(pendulum: Pendulum, system: BodiesSystem, places: dict[str, int]) -> m.Spring:
    place = places[pendulum.body]
    body = system.bodies[place]
    k = body.mass * system.gravity / pendulum.length
    return m.Spring(pendulum.name, (m.GROUND, place), _vector(body.at), (k, k, 0.0, 0.0, 0.0, 0.0))


def _link(link: Link, system: BodiesSystem, places: dict[str, int]) -> m.Link:
    ends = [system.bodies[places[end]] for end in link.between if end in places]
    shared = set.intersection(*(set(body.motions or ()) for body in ends))
    at = link.at or ends[0].at
    if link.at is None and len(ends) == 2 and not _turns(ends[1]) and _turns(ends[0]):
        at = ends[1].at
    axes = tuple(NUMBER_OF[motion] for motion in link.motions or sorted(shared, key=MOTIONS.index))
    return m.Link(link.name, _ends(link.between, places), _vector(at), axes)


def _turns(body: Body) -> bool:
    return any(motion[0] == "r" for motion in body.motions or ())
