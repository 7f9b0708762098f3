"""What a careful engineer would question: the warnings of an answer."""

from math import dist, pi

from schemas.connections import Beam, Damper, Link, Pad, Shaft, Spring
from schemas.materials import MATERIALS
from schemas.modes import ModesQuestion
from schemas.system import AnySystem, BodiesSystem, InertiaTensor, MatricesSystem
from service.compute.beams import bending_half_wave
from service.compute.half_space import SOURCE
from service.compute.real_modes import Modes
from service.tasks.machines import Analysed
from service.tasks.translation import machine_of

LEAST_ELEMENTS = 3  # for half a bending wave: below, a frequency may be off by a tenth of a percent


def system_warnings(system: AnySystem, analysed: Analysed, found: Modes) -> list[str]:
    """On the system itself, of which modes were found."""
    warnings = geometry_warnings(system, analysed, int(found.rigid.sum()))
    assembly = analysed.assembly
    damped = system.damping is not None or (
        isinstance(system, MatricesSystem) and system.structural is not None
    )
    if damped or (assembly is not None and (assembly.c.any() or assembly.h.any())):
        warnings.append("the system's damping isn't used: these are its undamped modes.")
    return warnings


def geometry_warnings(system: AnySystem, analysed: Analysed, rigid: int) -> list[str]:
    """On what the system is made of, with its number of rigid-body motions."""
    warnings = []
    if rigid:
        ground = ""
        if isinstance(system, BodiesSystem) and not _is_grounded(system):
            ground = " and no connection reaches ground"
        warnings.append(
            f"{rigid} rigid-body {'motion' if rigid == 1 else 'motions'} at 0 Hz: nothing brings "
            f"the machine back{ground}."
        )
    if analysed.pencil.massless:
        warnings.append(
            f"condensed out, because they carry no inertia: {_few(analysed.pencil.massless)}."
        )
    if analysed.pencil.ties.redundant:
        warnings.append(f"tied more than once: {_few(analysed.pencil.ties.redundant)}.")
    if analysed.pencil.ties.locking:
        warnings.append(
            f"{_few(analysed.pencil.ties.locking)} together with other ties hold a motion still."
        )
    if isinstance(system, BodiesSystem):
        warnings += _of_bodies(system, analysed) + _sources(system) + _pads_under(system)
    return warnings


def _is_grounded(system: BodiesSystem) -> bool:
    return any(body.held for body in system.bodies) or any(
        "ground" in getattr(connection, "between", ("ground",)) for connection in system.connections
    )


def _of_bodies(system: BodiesSystem, analysed: Analysed) -> list[str]:
    warnings = []
    slim = [body.name for body in system.bodies if _is_impossible(body.inertia)]
    if slim:
        warnings.append(
            f"no rigid body has such an inertia (one principal moment exceeds the sum of the "
            f"other two): {_few(slim)}."
        )
    assembly = analysed.assembly
    if assembly is not None:
        acting = {assembly.connection_names[row] for row in assembly.springs_of.tolist()}
        idle = [
            part.name
            for part in system.connections
            if isinstance(part, Spring | Damper) and part.name not in acting
        ]
        if idle:
            warnings.append(f"act on no motion that the bodies have: {_few(idle)}.")
    return warnings


def _sources(system: BodiesSystem) -> list[str]:
    """Where constants come from that the caller didn't give."""
    pads = [part.name for part in system.connections if isinstance(part, Pad)]
    warnings = [f"{_few(pads)}: constants by {SOURCE}."] if pads else []
    names = dict.fromkeys(
        str(material)
        for part in system.connections
        for material in (
            [part.material]
            if isinstance(part, Beam)
            else [section.material for section in part.sections or ()]
            if isinstance(part, Shaft)
            else []
        )
        if material is not None
    )
    return warnings + [
        f"values of {name} from the service's table: {MATERIALS[name].source} (from memory)."
        for name in names
    ]


def _pads_under(system: BodiesSystem) -> list[str]:
    """A pad counts only the body on it into its rocking and twisting damping."""
    carrying = [
        part.name
        for part in system.connections
        if isinstance(part, Pad)
        and any(
            isinstance(other, Link | Spring | Beam)
            and set(part.between) & set(other.between) - {"ground"}
            for other in system.connections
        )
    ]
    if not carrying:
        return []
    return [
        f"{_few(carrying)}: damping in rocking and twist counts the inertia of the body on the pad "
        "alone, not of what stands on that."
    ]


def mesh_warnings(system: AnySystem, highest_hz: float) -> list[str]:
    """Beams whose elements are long beside half a bending wave of the highest mode."""
    if not isinstance(system, BodiesSystem) or highest_hz <= 0.0:
        return []
    if not any(isinstance(part, Beam) for part in system.connections):
        return []
    machine = machine_of(system)
    coarse = []
    for beam in machine.beams:
        first, second = (machine.bodies[end].at for end in beam.ends)
        length = dist(first, second) / beam.elements
        if bending_half_wave(beam.section, highest_hz) < LEAST_ELEMENTS * length:
            coarse.append(beam.name)
    if not coarse:
        return []
    return [
        f"fewer than {LEAST_ELEMENTS} elements for half a bending wave at {highest_hz:.4g} Hz, the "
        f"highest mode listed: {_few(coarse)}; raise `elements`."
    ]


def _is_impossible(inertia: object) -> bool:
    """The triangle inequality of moments of inertia, where all three are given."""
    if not isinstance(inertia, InertiaTensor) or not (inertia.xx and inertia.yy and inertia.zz):
        return False
    moments = sorted((inertia.xx, inertia.yy, inertia.zz))
    return moments[2] > (moments[0] + moments[1]) * (1 + 1e-9)


def modes_warnings(
    system: AnySystem, analysed: Analysed, found: Modes, question: ModesQuestion
) -> list[str]:
    """On the modes found."""
    warnings = []
    returned, size = len(found.values), analysed.pencil.size
    if question.count is None and question.below_hz is None and returned < size:
        warnings.append(
            f"only the lowest {returned} of {size} modes: ask with `count` or `below_hz` for more."
        )
    if question.count is not None and question.count > size:
        warnings.append(f"the system has only {size} modes.")
    highest = float(found.values.max(initial=0.0)) ** 0.5 / (2 * pi)
    return warnings + mesh_warnings(system, highest) + solution_warnings(found)


def solution_warnings(found: Modes) -> list[str]:
    """On how well the modes are known."""
    warnings = []
    if found.cut:
        warnings.append("the last mode belongs to a repeated root of which others aren't listed.")
    if not found.complete:
        warnings.append(
            "the count of eigenvalues doesn't agree with the modes found: one may be missing."
        )
    unsure = [
        str(index + 1)
        for index, (value, bound, rigid) in enumerate(
            zip(found.values.tolist(), found.bounds.tolist(), found.rigid.tolist(), strict=True)
        )
        if not rigid and abs(value) <= bound
    ]
    if unsure:
        warnings.append(f"can't be told from 0 Hz within their bound: modes {', '.join(unsure)}.")
    if (found.values < -found.bounds).any():
        warnings.append(
            "the machine is statically unstable: some modes grow instead of oscillating."
        )
    return warnings


def _few(names: tuple[str, ...] | list[str]) -> str:
    shown = ", ".join(names[:8])
    return shown if len(names) <= 8 else f"{shown} and {len(names) - 8} more"
