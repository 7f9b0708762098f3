"""A machine over time: from the question to its time history."""

from dataclasses import dataclass
from typing import Any

import numpy as np

from schemas.faults import Fault, Invalid, pointer
from schemas.response.transient import TransientQuestion
from service.compute.machine import Floats
from service.compute.signals import Signal
from service.compute.state_space import StateSpace, state_space
from service.compute.transient import Input, TimeHistory, time_history
from service.tasks.dynamics import Dynamics, unknown
from service.tasks.inputs import base_quantity, base_signal, force_signal
from service.tasks.view import ORDERS, Moving, View, view_of

LARGEST_GROWTH = 300.0  # e-folds: squares still fit a double
AS_GIVEN = 1e-9  # of the largest: an initial displacement that the machine can take


@dataclass(frozen=True)
class Run:
    """A machine, what acts on it, and its time history.

    Attributes
    ----------
    pushes : (n,) force on the motions per signal
    bases : displacement, velocity and acceleration of each moving base
    """

    dynamics: Dynamics
    question: TransientQuestion
    view: View
    pushes: list[tuple[Signal, Floats]]
    moving: list[Moving]
    bases: list[tuple[Signal, Signal, Signal] | None]
    time_history: TimeHistory
    states: StateSpace

    def values(self, times: Floats, view: View | None = None) -> Floats:
        """(o, n) what is observed."""
        view = view or self.view
        B = self.dynamics.machine.B
        rows = [(power, part.real @ B) for power, part in zip(view.powers, view.rows, strict=True)]
        found = self.time_history.seen(rows, times)
        for (_, _, base), signals, own in zip(self.moving, self.bases, view.grounds, strict=True):
            moved = (own + view.rows @ base.carried).real
            for power, part in zip(view.powers, moved, strict=True):
                if signals is not None and part.any():
                    found += np.outer(part, signals[power].at(times))
        return found


def run_of(dynamics: Dynamics, question: TransientQuestion) -> Run:
    """The time history of a machine under what the question says.

    Raises
    ------
    Invalid
        The question names what the machine doesn't have, or what can't be.
    """
    _check_places(dynamics, question)
    moving = [
        (item.motion, item.about,
         dynamics.base(item.motion, item.about, question.at_rpm,
                       pointer(("base", index, "motion"))))
        for index, item in enumerate(question.base or [])
    ]  # fmt: skip
    view = view_of(dynamics, question, moving, question.at_rpm)
    pushes = _forces(dynamics, question)
    bases = [_kinematics(question, index, moving) for index in range(len(moving))]
    machine, B = dynamics.machine, dynamics.machine.B
    inputs = [Input(signal, force @ B) for signal, force in pushes]
    for (_, _, base), signals in zip(moving, bases, strict=True):
        if signals is not None:
            inputs += _base_inputs(dynamics, base.forces, signals)
            pushes += [
                (signal, force.real) for signal, force in zip(signals, base.forces, strict=True)
            ]
    states = state_space(machine, question.at_rpm)
    _check_growth(states, question)
    found = time_history(machine, states, _initial(dynamics, question), inputs)
    return Run(dynamics, question, view, pushes, moving, bases, found, states)


def _check_growth(states: StateSpace, question: TransientQuestion) -> None:
    """Refuse to follow an unstable machine until its motion leaves the range of numbers."""
    fastest = float(states.roots.real.max(initial=0.0))
    if fastest * question.duration_s > LARGEST_GROWTH:
        raise Invalid([Fault(
            "/duration_s",
            f"the machine is unstable, e-fold in {1.0 / fastest:.3g} s: follow it for less",
        )])  # fmt: skip


def _base_inputs(
    dynamics: Dynamics, forces: Any, signals: tuple[Signal, Signal, Signal]
) -> list[Input]:
    """Forces by displacement, velocity and acceleration; a loss factor acts as viscous, h/ω."""
    machine = dynamics.machine
    pushed = forces @ machine.B
    omega = np.sqrt(np.maximum(machine.stiffness, 0.0))
    lost = np.divide(
        pushed[0].imag, omega, out=np.zeros(len(omega)), where=(omega > 0.0) & (machine.mass > 0.0)
    )
    parts = (pushed[0].real, pushed[1].real + lost, pushed[2].real)
    return [Input(signal, part) for signal, part in zip(signals, parts, strict=True)]


def _check_places(dynamics: Dynamics, question: TransientQuestion) -> None:
    faults = [
        Fault(pointer(("forces", index, "at")), unknown(dynamics, item.at))
        for index, item in enumerate(question.forces or [])
        if item.at not in dynamics.place
    ]
    for index, name in enumerate(question.observe or []):
        if name not in dynamics.place:
            faults.append(Fault(pointer(("observe", index)), unknown(dynamics, name)))
    for field in ("displacement", "velocity"):
        for name in getattr(question.initial, field, {}):
            if name not in dynamics.place:
                place = pointer(("initial", field, name))
                faults.append(Fault(place, unknown(dynamics, name)))
    if faults:
        raise Invalid(faults)


def _forces(dynamics: Dynamics, question: TransientQuestion) -> list[tuple[Signal, Floats]]:
    pushes = []
    for index, item in enumerate(question.forces or []):
        try:
            signal = force_signal(item, question.duration_s)
        except Invalid as fault:
            raise fault.under(pointer(("forces", index))) from None
        if signal is not None:
            vector = np.zeros(len(dynamics.analysed.names))
            vector[dynamics.place[item.at]] = 1.0
            pushes.append((signal, vector))
    return pushes


def _kinematics(
    question: TransientQuestion, index: int, moving: list[Moving]
) -> tuple[Signal, Signal, Signal] | None:
    """Displacement, velocity and acceleration of a base, up to the end of the run.

    Raises
    ------
    Invalid
        The motion jumps where the machine would be struck by an infinite force.
    """
    assert question.base is not None
    item = question.base[index]
    end = question.duration_s
    try:
        signal = base_signal(item, end)
    except Invalid as fault:
        raise fault.under(pointer(("base", index))) from None
    if signal is None:
        return None
    quantity = base_quantity(item)
    forces = np.abs(moving[index][2].forces)
    order = ORDERS[quantity]
    going_on = signal.held_until(end) if order == 0 else signal.quiet_until(end)
    size = max(float(np.abs(signal.coefficients).max()), 1e-300)
    jumps = bool(np.abs(going_on.jumps()).max() > 1e-12 * size)
    struck = [bool(force.any()) for force in forces[order + 1 :]]
    if any(struck if jumps else struck[1:]):
        raise Invalid([Fault(
            pointer(("base", index)),
            f"a {quantity} that {'jumps' if jumps else 'has corners'} would strike this machine "
            "with an infinite force: start from zero, or give the acceleration",
        )])  # fmt: skip
    if order == 2:
        return going_on.integral().integral(), going_on.integral(), going_on
    if order == 1:
        return going_on.integral(), going_on, going_on.derivative()
    return going_on, going_on.derivative(), going_on.derivative().derivative()


def _initial(dynamics: Dynamics, question: TransientQuestion) -> tuple[Floats, Floats]:
    """Normal coordinates of the initial displacement and velocity."""
    displaced = _coordinates(dynamics, question, "displacement")
    return displaced, _coordinates(dynamics, question, "velocity")


def _coordinates(dynamics: Dynamics, question: TransientQuestion, field: str) -> Floats:
    """φᵀMq of the modes, ±PᵀKq of the motions without inertia.

    Raises
    ------
    Invalid
        Rigid ties don't allow it, or a motion without inertia can't start so.
    """
    given = getattr(question.initial, field, {})
    machine, K = dynamics.machine, dynamics.K
    q = np.zeros(len(dynamics.analysed.names))
    for name, value in given.items():
        q[dynamics.place[name]] = value
    M = dynamics.analysed.M
    by_mass, by_stiffness = machine.B.T @ (M @ q), machine.stiffness * (machine.B.T @ (K @ q))
    found: Floats = np.where(machine.mass > 0.0, by_mass, by_stiffness)
    if not given:
        return found
    off = np.abs(machine.B @ found - q) > AS_GIVEN * np.abs(q).max()
    if off.any():
        raise Invalid([
            Fault(pointer(("initial", field, name)), _cannot(name))
            for name in given if off[dynamics.place[name]]
        ] or [Fault(pointer(("initial", field)),
                    _cannot(dynamics.analysed.names[int(off.argmax())]))])  # fmt: skip
    return found


def _cannot(name: str) -> str:
    return (
        f"{name} follows other motions, by a rigid tie or without inertia: give the motion that "
        "goes with theirs"
    )
