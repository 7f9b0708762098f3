"""Where one looks at a machine: degrees of freedom, and forces that connections carry."""

from dataclasses import dataclass
from typing import Any

import numpy as np

from schemas.faults import Fault, Invalid, pointer
from schemas.quantities import Motion
from schemas.system import BodiesSystem
from service.compute import machine as m
from service.compute.couplings import Complexes
from service.compute.excitation import Base, Carried, carried, deformations
from service.compute.sparse_modes import SparsePencil
from service.tasks.dynamics import ORIGIN, Dynamics, unknown
from service.tasks.translation import NUMBER_OF

UNITS = {"displacement": ("m", "rad"), "velocity": ("m/s", "rad/s"),
         "acceleration": ("m/s²", "rad/s²")}  # fmt: skip
ORDERS = {"displacement": 0, "velocity": 1, "acceleration": 2}
ALL_UP_TO = 50


@dataclass(frozen=True, slots=True)
class View:
    """What is looked at: Σ over powers of d/dt of rows·q, and of the bases' own motion.

    Attributes
    ----------
    labels : (at, quantity, unit) of each
    powers : of d/dt (or of iω)
    rows : (k, o, n) per power
    grounds : per moving base (k, o)
    """

    labels: tuple[tuple[str, str, str], ...]
    powers: tuple[int, ...]
    rows: Complexes
    grounds: tuple[Complexes, ...]


Moving = tuple[Motion, list[float] | None, Base]


def view_of(dynamics: Dynamics, question: Any, bases: list[Moving], rpm: float) -> View:
    """The observed degrees of freedom and the forces carried.

    Raises
    ------
    Invalid
        A name that the system doesn't have, or a connection whose force can't be told.
    """
    faults: list[Fault] = []
    views = [_motions(dynamics, question, bases, faults)]
    if question.forces_in:
        views += _forces(dynamics, question.forces_in, bases, rpm, faults)
    if faults:
        raise Invalid(faults)
    return _joined(views)


def _motions(dynamics: Dynamics, question: Any, bases: list[Moving], faults: list[Fault]) -> View:
    names = list(dynamics.analysed.names)
    wanted = question.observe
    if wanted is None:
        wanted = [] if question.forces_in else names
        if len(wanted) > ALL_UP_TO:
            faults.append(Fault("/observe", f"say which of {len(names)} degrees of freedom"))
            wanted = []
    places = []
    for index, name in enumerate(wanted):
        if name in dynamics.place:
            places.append(dynamics.place[name])
        else:
            faults.append(Fault(pointer(("observe", index)), unknown(dynamics, name)))
    rows = np.zeros((1, len(places), len(names)), dtype=complex)
    rows[0, range(len(places)), places] = 1.0
    grounds = [
        -base.rigid[places][None] if question.relative_to_base else np.zeros((1, len(places)))
        for _, _, base in bases
    ]
    units = UNITS[question.quantity]
    labels = tuple(
        (names[row], question.quantity, units[int(dynamics.analysed.axes[row] >= 3)])
        for row in places
    )
    power = ORDERS[question.quantity]
    return View(labels, (power,), rows, tuple(ground.astype(complex) for ground in grounds))


def _forces(
    dynamics: Dynamics, names: list[str], bases: list[Moving], rpm: float, faults: list[Fault]
) -> list[View]:
    if not isinstance(dynamics.system, BodiesSystem):
        faults.append(Fault("/forces_in", "a system of matrices has no connections"))
        return []
    if isinstance(dynamics.analysed.pencil, SparsePencil):
        faults.append(Fault("/forces_in", "forces carried aren't computed for so large a system"))
        return []
    space = dynamics.space()
    moved = [
        deformations(dynamics.space(_vector(about)), NUMBER_OF[motion])[1]
        for motion, about, _ in bases
    ]
    views = []
    for index, name in enumerate(names):
        place = pointer(("forces_in", index))
        if name not in space.whole.connection_names:
            faults.append(Fault(place, f"there is no connection '{name}'"))
            continue
        part = carried(space, name, rpm, dynamics.damping.beta)
        if part is None:
            faults.append(Fault(place, "the force in a rigid tie isn't computed: give it a "
                                       "stiffness, or ask for what is beside it"))  # fmt: skip
            continue
        views.append(_force_view(name, part, moved))
    return views


def _vector(about: list[float] | None) -> m.Vector:
    x, y, z = about or ORIGIN
    return (x, y, z)


def _force_view(name: str, part: Carried, moved: list[m.Floats]) -> View:
    labels = tuple(
        (f"{name}/{m.AXES[axis]}", *(("force", "N") if axis < 3 else ("moment", "N·m")))
        for axis in part.axes
    )
    return View(labels, (0, 1), part.rows, tuple(part.by_ground(own) for own in moved))


def _joined(views: list[View]) -> View:
    """One view of all, with the powers that any of them has."""
    powers = tuple(sorted({power for view in views for power in view.powers}))
    return View(
        tuple(label for view in views for label in view.labels),
        powers,
        np.concatenate([_spread(view.powers, view.rows, powers) for view in views], axis=1),
        tuple(
            np.concatenate(
                [_spread(view.powers, view.grounds[base], powers) for view in views], axis=1
            )
            for base in range(len(views[0].grounds))
        ),
    )


def _spread(own: tuple[int, ...], parts: Complexes, powers: tuple[int, ...]) -> Complexes:
    found = np.zeros((len(powers), *parts.shape[1:]), dtype=complex)
    for power, part in zip(own, parts, strict=True):
        found[powers.index(power)] = part
    return found
