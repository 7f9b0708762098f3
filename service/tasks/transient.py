"""The task `response/transient`: what the machine does over time."""

from math import pi
from typing import Any

import numpy as np

from schemas.faults import Fault, Invalid
from schemas.response.transient import MOST_VALUES, TransientQuestion
from schemas.system import AnySystem
from service.compute.machine import Floats
from service.compute.shock_spectrum import shock_spectrum
from service.compute.thinning import kept_points
from service.compute.transient import largest, terms
from service.tasks.damping import speed_matters
from service.tasks.dynamics import dynamics_of
from service.tasks.inputs import base_quantity, base_signal
from service.tasks.modes import CAUTION
from service.tasks.readings import number
from service.tasks.run import Run, run_of
from service.tasks.severity import zone
from service.tasks.transient_evidence import evidence
from service.tasks.view import view_of
from service.tasks.wary import geometry_warnings

CLOSER, ROUNDS = 33, 2  # points around the largest value of a series, so many times over
MOST_TERMS = 200


def transient(system: AnySystem, question: TransientQuestion) -> dict[str, Any]:
    """Answer a question on the response over time.

    Raises
    ------
    Invalid
        The system can't be computed, or the question names what it doesn't have; pointers start at
        the question.
    """
    dynamics = dynamics_of(system, question.at_rpm)
    run = run_of(dynamics, question)
    times: Floats = np.arange(_steps(question), dtype=float) * question.time_step_s
    labels = run.view.labels
    _check_size(len(labels), len(times), question)
    values = run.values(times)
    kept = kept_points(values, question.max_points or len(times))
    tops = _largest(run, times, values)
    return {
        "time_s": times[kept].tolist(),
        "series": [
            {"at": at, "quantity": quantity, "unit": unit, "values": own[kept].tolist()}
            for (at, quantity, unit), own in zip(labels, values, strict=True)
        ],
        "modal_terms": _modal_terms(run),
        "largest": tops,
        "reading": _reading(tops),
        **_severity(run, times),
        **_shock_spectra(run),
        "warnings": [
            *geometry_warnings(system, dynamics.analysed, int(dynamics.modes.rigid.sum())),
            *_warnings(run),
        ],
        "evidence": evidence(run, times),
        "caution": CAUTION,
    }


def _steps(question: TransientQuestion) -> int:
    """Times from 0 to `duration_s`, which is met where it is a multiple of the step."""
    return int(question.duration_s / question.time_step_s * (1 + 1e-12) + 1e-9) + 1


def _check_size(series: int, steps: int, question: TransientQuestion) -> None:
    if series * min(steps, question.max_points or steps) > MOST_VALUES:
        raise Invalid(
            [Fault("/max_points", f"{series * steps:,} values: observe less or thin them")]
        )
    if question.max_points is not None and 2 * series + 2 > question.max_points:
        raise Invalid([Fault("/max_points", f"too few to keep the peaks of {series} series")])


def _largest(run: Run, times: Floats, values: Floats) -> list[dict[str, Any]]:
    """Of each series, first among the steps, then closer and closer around the largest."""
    tops = largest(values, times)
    best = [(float(values[row, top]), float(times[top])) for row, top in enumerate(tops)]
    step = float(times[1] - times[0])
    for _ in range(ROUNDS if len(best) <= 60 else 0):
        grids = [
            np.linspace(max(0.0, at - step), min(float(times[-1]), at + step), CLOSER)
            for _, at in best
        ]
        everywhere, index = np.unique(np.concatenate(grids), return_inverse=True)
        closer = run.values(everywhere)
        step *= 2.0 / (CLOSER - 1)
        for row, (value, _) in enumerate(best):
            own = index[row * CLOSER : (row + 1) * CLOSER]
            top = int(own[np.abs(closer[row, own]).argmax()])
            if abs(closer[row, top]) > abs(value):
                best[row] = float(closer[row, top]), float(everywhere[top])
    return [
        {"at": at, "quantity": quantity, "unit": unit, "value": value, "time_s": when}
        for (at, quantity, unit), (value, when) in zip(run.view.labels, best, strict=True)
    ]


def _modal_terms(run: Run) -> list[dict[str, Any]]:
    if run.pushes or run.bases:
        return []
    names = run.question.observe or list(run.dynamics.analysed.names)
    rows = run.dynamics.machine.B[[run.dynamics.place[name] for name in names]]
    return [
        {
            "mode": index + 1,
            "frequency_hz": abs(term.root) / (2 * pi),
            "damped_frequency_hz": term.root.imag / (2 * pi),
            "decay_per_s": -term.root.real + 0.0,
            "terms": [
                {
                    "at": name,
                    "cosine": value.real + 0.0,
                    "sine": 0.0 - value.imag,
                    **({} if term.drift is None else {"drift_per_s": float(term.drift[row])}),
                }
                for row, (name, value) in enumerate(
                    zip(names, term.coefficients.tolist(), strict=True)
                )
            ],
        }
        for index, term in enumerate(terms(run.time_history, rows)[:MOST_TERMS])
    ]


def _reading(tops: list[dict[str, Any]]) -> str:
    if not tops:
        return "Nothing is observed."
    top = max(tops, key=lambda item: abs(item["value"]))
    return (
        f"The largest {top['quantity']} is {number(abs(top['value']))} {top['unit']} at "
        f"{top['at']}, after {number(top['time_s'])} s."
    )


def _severity(run: Run, times: Floats) -> dict[str, Any]:
    """Root of the mean square velocity over the whole run, of each translation observed."""
    wanted = run.question.severity
    if wanted is None:
        return {}
    asked = run.question.model_copy(update={"quantity": "velocity", "forces_in": None})
    view = view_of(run.dynamics, asked, run.moving, run.question.at_rpm)
    speeds = run.values(times, view)
    return {
        "severity": [
            zone(at, float(np.sqrt((own**2).mean())), wanted)
            for (at, _, unit), own in zip(view.labels, speeds, strict=True)
            if not unit.startswith("rad")
        ]
    }


def _shock_spectra(run: Run) -> dict[str, Any]:
    wanted = run.question.shock_spectrum
    if wanted is None:
        return {}
    frequencies = np.geomspace(wanted.from_hz, wanted.to_hz, wanted.points)
    found = []
    for item in run.question.base or []:
        signal = base_signal(item, run.question.duration_s)
        if signal is None or base_quantity(item) != "acceleration":
            continue
        for ratio in wanted.damping_ratios:
            spectrum = shock_spectrum(signal, frequencies, ratio)
            found.append({
                "motion": item.motion,
                "damping_ratio": ratio,
                "frequency_hz": frequencies.tolist(),
                "absolute_acceleration_m_s2": spectrum.acceleration.tolist(),
                "relative_displacement_m": spectrum.displacement.tolist(),
                "pseudo_velocity_m_s": (2 * pi * frequencies * spectrum.displacement).tolist(),
            })  # fmt: skip
    return {"shock_spectrum": found}


def _warnings(run: Run) -> list[str]:
    warnings = []
    machine, states = run.dynamics.machine, run.states
    if machine.structural.any() or machine.couplings.structural.any():
        warnings.append(
            "loss factors act as viscous damping of each mode, the usual equivalent at its "
            "resonance: structural damping has no equation in time."
        )
    if states.circle.any() and not (run.pushes or run.bases):
        warnings.append("a critically damped mode isn't among the modal terms: it has no cosine.")
    if len(states.roots) > MOST_TERMS and not (run.pushes or run.bases):
        warnings.append(f"only the {MOST_TERMS} lowest modal terms are listed.")
    if (states.roots.real > 1e-9 * np.abs(states.roots)).any():
        warnings.append("the machine is unstable: some of its motion grows without bound.")
    if states.residual > 1e-9:
        warnings.append("the machine's damped modes are nearly defective: fewer digits hold.")
    chirps = any(
        item.shape == "chirp" for item in (*(run.question.forces or []), *(run.question.base or []))
    )
    if chirps and speed_matters(run.dynamics.damping):
        warnings.append("during the run-up gyroscopic terms and bearings stay as at `at_rpm`.")
    return warnings
