"""What is said of a stored system."""

from typing import Any

import numpy as np

from schemas.system import AnySystem, BodiesSystem
from service.compute.real_modes import Wanted
from service.compute.rigid_motions import rigid_motions
from service.compute.sparse_modes import SparsePencil
from service.tasks.machines import Analysed, analyse, degrees_of_freedom, solved
from service.tasks.wary import geometry_warnings


def summarize(system: AnySystem) -> dict[str, Any]:
    """Degrees of freedom, mass, centre of mass, rigid-body motions and warnings of a system.

    Raises
    ------
    Invalid
        The system can't be computed; pointers start at the system.
    """
    analysed = analyse(system)
    free = _free(system, analysed)
    mass, centre = _mass(system)
    return {
        "kind": system.kind,
        "name": system.name,
        "degrees_of_freedom": degrees_of_freedom(system),
        "independent_motions": analysed.pencil.size,
        "total_mass_kg": mass,
        "centre_of_mass_m": centre,
        "rigid_body_motions": free,
        "warnings": geometry_warnings(system, analysed, free),
    }


def _free(system: AnySystem, analysed: Analysed) -> int:
    """Number of rigid-body motions; of a large system those among the lowest seven modes."""
    if isinstance(analysed.pencil, SparsePencil):
        return int(solved(system, analysed.pencil, Wanted(count=7)).rigid.sum())
    return int(rigid_motions(analysed.pencil).shape[1])


def _mass(system: AnySystem) -> tuple[float | None, list[float] | None]:
    if not isinstance(system, BodiesSystem):
        return None, None
    masses = np.array([body.mass for body in system.bodies])
    total = float(masses.sum())
    places = np.array([body.at for body in system.bodies])
    return total, (masses @ places / total).tolist() if total > 0.0 else None
