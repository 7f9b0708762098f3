"""What lets a reader trust a steady response without trusting the program."""

from math import pi
from typing import TYPE_CHECKING, Any

import numpy as np

from service.compute.assembly import Matrix
from service.compute.damped_system import has_entries
from service.compute.harmonic import Load
from service.compute.machine import Floats
from service.compute.sparse_modes import SparsePencil

if TYPE_CHECKING:
    from service.tasks.steady import Steady

CHECKED = 5


def evidence(steady: "Steady", places: Floats, centres: Floats) -> dict[str, Any]:
    """Residual of the equation of motion at a few frequencies, and reciprocity.

    Parameters
    ----------
    places : (f,) ascending
    centres : resonances; the check goes to points near them too
    """
    checked = _checked(places, centres)
    residuals = [_residual(steady, float(place)) for place in checked]
    known = [value for value in residuals if value is not None]
    return {
        "method": _method(steady),
        "largest_relative_residual": max(known) if known else None,
        "checked_at_hz": (steady.omega(checked) / (2 * pi)).tolist(),
        "reciprocity_difference": _reciprocity(steady, float(checked[len(checked) // 2])),
    }


def _method(steady: "Steady") -> str:
    if not isinstance(steady.dynamics.analysed.pencil, SparsePencil):
        return steady.responder.method
    modes = len(steady.dynamics.modes.values)
    counted = "none missed by count" if steady.dynamics.modes.complete else "count not confirmed"
    return (
        f"{steady.responder.method}, on the {modes} lowest modes ({counted}) with static "
        "correction and its higher terms"
    )


def _checked(places: Floats, centres: Floats) -> Floats:
    even = np.linspace(0, len(places) - 1, min(CHECKED, len(places))).astype(int)
    near = np.abs(places[:, None] - centres[:CHECKED]).argmin(axis=0) if centres.size else even[:0]
    return np.unique(places[np.concatenate([even, near])])


def _residual(steady: "Steady", place: float) -> float | None:
    """‖Zq − f‖ / (‖Z‖‖q‖ + ‖f‖) in the motions that the ties leave."""
    at = np.array([place])
    omega, rpm = steady.omega(at), steady.rpm(at)
    frame = steady.frame(float(rpm[0]))
    q = steady.dynamics.machine.B @ steady.responder.coordinates(frame.pushed, omega, rpm)[0]
    if not np.isfinite(q).all():
        return None
    Z = dynamic_stiffness(steady, float(omega[0]), float(rpm[0]))
    f = frame.load.at(omega)[0]
    T = steady.dynamics.analysed.pencil.ties.T
    left, size = Z @ q - f, abs(Z) @ np.abs(q) + np.abs(f)
    left = left + 1j * omega[0] * steady.dynamics.dissipation.modal(q)
    if T is not None:
        left, size = T.T @ left, np.abs(T.T) @ size
    largest = float(size.max())
    return float(np.abs(left).max()) / largest if largest > 0.0 else 0.0


def dynamic_stiffness(steady: "Steady", omega: float, rpm: float) -> Matrix:
    """(n, n) Z = K + iH + iωC − ω²M from the matrices themselves."""
    dynamics = steady.dynamics
    return (
        dynamics.elastic(rpm) + 1j * omega * dynamics.viscous(rpm) - omega**2 * dynamics.analysed.M
    )


def _reciprocity(steady: "Steady", place: float) -> float | None:
    """|αᵢⱼ − αⱼᵢ| over their size, for a place of excitation and one of observation."""
    damping = steady.dynamics.damping
    at = np.array([place])
    omega, rpm = steady.omega(at), steady.rpm(at)
    matrices = (damping.circulatory(float(rpm[0])), damping.viscous(float(rpm[0])), damping.H)
    if any(has_entries(A - A.T) for A in matrices):
        return None
    pair = _pair(steady)
    if pair is None:
        return None
    rows = steady.dynamics.machine.B[list(pair)]
    receptance = np.array([
        rows @ steady.responder.coordinates(Load((0,), row[None].astype(complex)), omega, rpm)[0]
        for row in rows
    ])  # fmt: skip
    if not np.isfinite(receptance).all():
        return None
    there, back = receptance[0, 1], receptance[1, 0]
    scale = float(np.sqrt(np.abs(receptance[0, 0] * receptance[1, 1])))
    return float(abs(there - back)) / scale if scale > 0.0 else 0.0


def _pair(steady: "Steady") -> tuple[int, int] | None:
    place = steady.dynamics.place
    driven = [place[item.at] for item in steady.question.excite if item.at is not None]
    seen = [place[name] for name in steady.question.observe or place]
    for first in driven or seen:
        for second in seen:
            if first != second:
                return first, second
    return None
