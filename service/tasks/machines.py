"""From a posted system to what compute works on, and from its complaints back to a place in it."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.sparse import csc_array

from schemas.connections import Beam
from schemas.faults import Fault, Invalid, pointer
from schemas.quantities import split_degree_of_freedom
from schemas.system import AnySystem, BodiesSystem, MatricesSystem
from service.compute import machine as m
from service.compute.assembly import Assembly, Entries, Matrix, assemble
from service.compute.constraints import Ties
from service.compute.memory import check_memory, dense_bytes, prefer_sparse
from service.compute.participation import support_motions
from service.compute.pencil import pencil_of_matrices
from service.compute.real_modes import Modes, Wanted
from service.compute.solve import AnyPencil, lowest_modes, pencil_at
from service.compute.sparse_modes import SparsePencil
from service.tasks.matrices import dense, matrix_of, symmetric_part
from service.tasks.translation import NUMBER_OF, machine_of


@dataclass(frozen=True, slots=True)
class Analysed:
    """A system made ready to be solved.

    Attributes
    ----------
    names : BODY/MOTION per degree of freedom, n of them
    owners, axes : (n,) index into `points`, and axis 0 to 5
    points : bodies, and inner points of beams
    M : (n, n) mass matrix; masses : its entries, each with its owner among `carriers`
    pencil : what is solved
    directions : axes of the rigid-body motions of the supports, and those motions (n, d)
    assembly : the deformation rows, None for explicit matrices
    """

    names: tuple[str, ...]
    owners: m.Integers
    axes: m.Integers
    points: tuple[str, ...]
    M: Matrix
    masses: Entries
    carriers: tuple[str, ...]
    pencil: AnyPencil
    directions: tuple[list[int], m.Floats]
    assembly: Assembly | None


def degrees_of_freedom(system: AnySystem) -> int:
    """How many motions the system has that aren't held (no unit)."""
    if isinstance(system, MatricesSystem):
        return len(system.degrees_of_freedom)
    able = {body.name: set(body.motions or ()) for body in system.bodies}
    own = sum(len(able[body.name] - set(body.held)) for body in system.bodies)
    inner = (
        (part.elements - 1) * len(set[str]().union(*(able[end] for end in part.between)))
        for part in system.connections
        if isinstance(part, Beam)
    )
    return own + sum(inner)


def analyse(system: AnySystem, rpm: float = 0.0) -> Analysed:
    """Assemble and reduce a system, its bearings as they are at `rpm`.

    Raises
    ------
    Invalid
        The system can't be computed; pointers start at the system.
    """
    try:
        if isinstance(system, BodiesSystem):
            return _of_bodies(system, rpm)
        return _of_matrices(system)
    except m.Unsound as fault:
        raise Invalid([Fault(_place(system, fault.part), fault.detail)]) from None


def solved(system: AnySystem, pencil: AnyPencil, wanted: Wanted) -> Modes:
    """The wanted modes of an analysed system.

    Raises
    ------
    Invalid
        They can't be computed, or not within the memory; pointers start at the system.
    """
    try:
        return lowest_modes(pencil, wanted)
    except m.Unsound as fault:
        raise Invalid([Fault(_place(system, fault.part), fault.detail)]) from None


def _of_bodies(system: BodiesSystem, rpm: float) -> Analysed:
    assembly = assemble(machine_of(system))
    return Analysed(
        assembly.names,
        assembly.owners,
        assembly.axes,
        assembly.points,
        assembly.M,
        assembly.masses,
        assembly.carriers,
        pencil_at(assembly, rpm),
        support_motions(assembly),
        assembly,
    )


def _of_matrices(system: MatricesSystem) -> Analysed:
    size = len(system.degrees_of_freedom)
    faults: list[Fault] = []
    matrices = {}
    for field in ("mass", "stiffness"):
        posted = getattr(system, field)
        found = matrix_of(posted, field, size, faults)
        if found is not None:
            matrices[field] = symmetric_part(found, posted, field, faults)
    if faults:
        raise Invalid(faults)
    split = [split_degree_of_freedom(name) for name in system.degrees_of_freedom]
    pairs = [pair for pair in split if pair is not None]
    bodies = tuple(dict.fromkeys(body for body, _ in pairs))
    index = {body: number for number, body in enumerate(bodies)}
    axes = np.array([NUMBER_OF[motion] for _, motion in pairs])
    owners = np.array([index[body] for body, _ in pairs])
    mass = matrices["mass"].tocoo()
    names = tuple(system.degrees_of_freedom)
    M, pencil = _pencil_of_matrices(matrices["mass"], matrices["stiffness"], names)
    present = sorted(set(axes.tolist()))
    return Analysed(
        names,
        owners,
        axes,
        bodies,
        M,
        Entries(mass.row.astype(int), mass.col.astype(int), mass.data, owners[mass.row]),
        bodies,
        pencil,
        (present, (axes[:, None] == present).astype(float)),
        None,
    )


def _pencil_of_matrices(
    M: csc_array[Any], K: csc_array[Any], names: tuple[str, ...]
) -> tuple[Matrix, AnyPencil]:
    """The mass matrix and the pencil, dense or sparse by size and density."""
    size = len(names)
    if prefer_sparse(size, max(M.nnz, K.nnz)):
        ties = Ties(None, np.arange(size), (), ())
        return M, SparsePencil(K, M, None, names, ties)
    check_memory(dense_bytes(size), "stiffness")
    full = dense(M)
    return full, pencil_of_matrices(dense(K), full, names)


def _place(system: AnySystem, part: tuple[str | int, ...]) -> str:
    """A pointer into the system to the part that compute complains of."""
    kind, *rest = part
    if isinstance(system, MatricesSystem):
        if kind == "degree of freedom":
            return pointer(("degrees_of_freedom", system.degrees_of_freedom.index(str(rest[0]))))
        if kind in ("mass", "stiffness"):
            return pointer(part)
        return "/degrees_of_freedom" if kind == "modes" else "/mass"
    if kind == "degree of freedom":
        name = str(rest[0]).rpartition("/")[0]
        bodies = [item.name for item in system.bodies]
        if name in bodies:
            return pointer(("bodies", bodies.index(name)))
        beam = name.rpartition(".")[0]
        parts = [item.name for item in system.connections]
        return pointer(("connections", parts.index(beam)))
    if kind == "connection":
        parts = [item.name for item in system.connections]
        return pointer(("connections", parts.index(str(rest[0])), *rest[1:]))
    return "/bodies"
