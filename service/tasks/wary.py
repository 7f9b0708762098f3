"""What a careful engineer would question: the warnings of an answer."""

from schemas.connections import Damper, Spring
from schemas.modes import ModesQuestion
from schemas.system import AnySystem, BodiesSystem, InertiaTensor, MatricesSystem
from service.compute.real_modes import Modes
from service.tasks.machines import Analysed


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
        warnings += _of_bodies(system, analysed)
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


def _is_impossible(inertia: object) -> bool:
    """The triangle inequality of moments of inertia, where all three are given."""
    if not isinstance(inertia, InertiaTensor) or not (inertia.xx and inertia.yy and inertia.zz):
        return False
    moments = sorted((inertia.xx, inertia.yy, inertia.zz))
    return moments[2] > (moments[0] + moments[1]) * (1 + 1e-9)


def modes_warnings(analysed: Analysed, found: Modes, question: ModesQuestion) -> list[str]:
    """On the modes found."""
    warnings = []
    returned, size = len(found.values), analysed.pencil.size
    if question.count is None and question.below_hz is None and returned < size:
        warnings.append(
            f"only the lowest {returned} of {size} modes: ask with `count` or `below_hz` for more."
        )
    if question.count is not None and question.count > size:
        warnings.append(f"the system has only {size} modes.")
    return warnings + solution_warnings(found)


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
