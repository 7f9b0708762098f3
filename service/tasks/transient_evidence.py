"""What lets a reader trust a response over time without trusting the program."""

from typing import TYPE_CHECKING, Any

import numpy as np

from service.compute.machine import Floats
from service.compute.transient import dissipated

if TYPE_CHECKING:
    from service.tasks.run import Run

CHECKED = 5
BALANCED_UP_TO = 300  # degrees of freedom


def evidence(run: "Run", times: Floats) -> dict[str, Any]:
    """Residual of the equation of motion at a few times; energy balance of a free motion."""
    checked = times[np.unique(np.linspace(0, len(times) - 1, CHECKED).astype(int))]
    coupled = len(run.dynamics.machine.couplings.rows) > 0
    return {
        "method": ("complex modes" if coupled else "modes")
        + ", exact recursion over polynomial segments of the input",
        "largest_relative_residual": _residual(run, checked),
        "checked_at_s": checked.tolist(),
        "energy_balance": _energy_balance(run, float(times[-1])),
    }


def _residual(run: "Run", times: Floats) -> float | None:
    """‖Mq″ + Cq′ + Kq − f‖ over the sum of the sizes of the terms; None with loss factors."""
    dynamics = run.dynamics
    if dynamics.damping.H.any():
        return None
    B, rpm = dynamics.machine.B, run.question.at_rpm
    q, v, a = (run.time_history.seen([(power, B)], times) for power in range(3))
    f = sum((np.outer(force, signal.at(times)) for signal, force in run.pushes), 0.0 * q)
    matrices = (dynamics.elastic(rpm).real, dynamics.viscous(rpm), dynamics.analysed.M)
    parts = [A @ x for A, x in zip(matrices, (q, v, a), strict=True)]
    sizes = sum(np.abs(A) @ np.abs(x) for A, x in zip(matrices, (q, v, a), strict=True))
    left, size = sum(parts) + dynamics.dissipation.modal(v) - f, sizes + np.abs(f)
    T = dynamics.analysed.pencil.ties.T
    if T is not None:
        left, size = T.T @ left, np.abs(T.T) @ size
    largest = float(np.max(size))
    return float(np.abs(left).max()) / largest if largest > 0.0 else 0.0


def _energy_balance(run: "Run", end: float) -> float | None:
    """Energy at the end and what was dissipated, less the energy at the start."""
    dynamics, rpm = run.dynamics, run.question.at_rpm
    crossed = dynamics.damping.circulatory(rpm).any() or dynamics.damping.H.any()
    large = len(dynamics.analysed.names) > BALANCED_UP_TO
    if run.pushes or run.bases or crossed or large:
        return None
    B = dynamics.machine.B
    times = np.array([0.0, end])
    q, v = (run.time_history.seen([(power, B)], times) for power in range(2))
    energy = ((v * (dynamics.analysed.M @ v)).sum(axis=0) + (q * (dynamics.K @ q)).sum(axis=0)) / 2
    C = dynamics.viscous(rpm)
    modal = dynamics.dissipation.modal(np.eye(len(C)))
    lost = dissipated(run.time_history, B, (C + C.T) / 2 + modal, end)
    before, after = energy.tolist()
    scale = max(abs(before), abs(after), abs(lost))
    return (after + lost - before) / scale if scale > 0.0 else 0.0
