"""The task `separation`: does every mode keep clear of everything that excites the machine?"""

from dataclasses import dataclass
from math import pi
from typing import Any

import numpy as np

from schemas.faults import Fault, Invalid, pointer
from schemas.separation import FractionRule, Operation, SeparationQuestion
from schemas.system import AnySystem
from service.compute.machine import Floats
from service.compute.participation import mobility_shares
from service.compute.real_modes import Wanted
from service.compute.separation import (
    Excitation,
    Margin,
    Required,
    barred,
    coincidence_rpm,
    free_ranges,
    margin,
)
from service.compute.solve import lowest_modes
from service.tasks.machines import Analysed, analyse
from service.tasks.modes import CAUTION, evidence, hertz, kinds
from service.tasks.readings import listed, number, two_percents
from service.tasks.wary import solution_warnings, system_warnings

UNDRIVEN = 1e-12  # of the driving-point mobility: a mode with less is at a node of its shape
TORSIONAL = Required(0.1, 0.1)  # API 617, torsional separation of 10 % (from memory)
RANK = {"coincident": 0, "short": 1, "clear": 2, "unexcited": 3}


@dataclass(frozen=True, slots=True)
class Candidate:
    """A mode that may meet an excitation; participation per excitation where it is asked for."""

    number: int
    frequency: float
    participation: dict[str, float]

    def undriven_by(self, excitation: str) -> bool:
        """Whether the excitation acts only where this mode doesn't move."""
        return self.participation.get(excitation, 1.0) < UNDRIVEN


def separation(system: AnySystem, question: SeparationQuestion) -> dict[str, Any]:
    """Answer a question on separation.

    Raises
    ------
    Invalid
        The system can't be computed, or `forces_at` names no motion of it; pointers start at the
        question.
    """
    try:
        analysed = analyse(system)
    except Invalid as fault:
        raise fault.under("/system") from None
    places = _places(analysed, question)
    required = required_margins(question)
    excitations = [
        Excitation(
            item.name,
            None if item.order is None else item.order * (item.shaft_ratio or 1.0),
            item.frequency_hz,
        )
        for item in question.excitations
    ]
    top = max(_top(item, question.operation) for item in excitations) * (1.0 + required.above)
    found = lowest_modes(analysed.pencil, Wanted(limit=(2 * pi * top) ** 2, spare=1))
    shapes = analysed.pencil.full(found.shapes)
    shares = _participations(analysed, shapes, places)
    oscillating = [
        Candidate(
            index + 1,
            hertz(float(found.values[index])),
            {name: float(share[index]) for name, share in shares.items()},
        )
        for index, kind in enumerate(kinds(found))
        if kind == "oscillating"
    ]
    candidates = _reachable(oscillating, excitations, question.operation, top)
    findings = [
        _finding(mode, excitation, operation, required)
        for mode in candidates
        for excitation in excitations
        for operation in question.operation
    ]
    findings.sort(key=_worst_first)
    verdict = _verdict(findings)
    return {
        "verdict": verdict,
        "reading": _reading(verdict, findings),
        "findings": findings,
        "coincidences": _coincidences(candidates, excitations, question.operation),
        "clear_speeds": _clear_speeds(
            candidates, excitations, question.operation, required, findings
        ),
        "warnings": [
            *system_warnings(system, analysed, found),
            *solution_warnings(found),
            *_warnings(findings, excitations, required),
        ],
        "evidence": evidence(found),
        "caution": CAUTION,
    }


def required_margins(question: SeparationQuestion) -> Required:
    """The margins that the rule of the question asks for."""
    if isinstance(question.rule, FractionRule):
        return Required(question.rule.mode_above, question.rule.mode_below)
    return TORSIONAL


def _top(excitation: Excitation, operations: list[Operation]) -> float:
    return max(excitation.band(item.min_rpm, item.max_rpm)[1] for item in operations)


def _places(analysed: Analysed, question: SeparationQuestion) -> dict[str, list[int]]:
    """Per excitation, the rows of the shapes where it acts."""
    row_of = {name: row for row, name in enumerate(analysed.names)}
    faults = [
        Fault(
            pointer(("forces_at", excitation, index)),
            f"the system has no degree of freedom '{name}' that can move",
        )
        for excitation, names in (question.forces_at or {}).items()
        for index, name in enumerate(names)
        if name not in row_of
    ]
    if faults:
        raise Invalid(faults)
    return {
        excitation: [row_of[name] for name in names]
        for excitation, names in (question.forces_at or {}).items()
    }


def _participations(
    analysed: Analysed, shapes: Floats, places: dict[str, list[int]]
) -> dict[str, Floats]:
    return {
        name: np.asarray(mobility_shares(analysed.pencil, shapes, rows).max(axis=0))
        for name, rows in places.items()
    }


def _reachable(
    modes: list[Candidate], excitations: list[Excitation], operations: list[Operation], top: float
) -> list[Candidate]:
    """The modes up to the highest excitation with its margin, and the nearest to each."""
    chosen = {mode.number for mode in modes if mode.frequency <= top * (1 + 1e-12)}
    for excitation in excitations:
        for operation in operations:
            low, high = excitation.band(operation.min_rpm, operation.max_rpm)
            if modes:
                chosen.add(min(modes, key=lambda m: _distance(m.frequency, low, high)).number)
    return [mode for mode in modes if mode.number in chosen]


def _distance(frequency: float, low: float, high: float) -> float:
    return max(low - frequency, frequency - high, 0.0)


def _finding(
    mode: Candidate, excitation: Excitation, operation: Operation, required: Required
) -> dict[str, Any]:
    low, high = excitation.band(operation.min_rpm, operation.max_rpm)
    kept = margin(mode.frequency, low, high, required)
    if mode.undriven_by(excitation.name):
        verdict = "unexcited"
    elif kept.side == "inside":
        verdict = "coincident"
    else:
        verdict = "clear" if kept.is_kept else "short"
    rpm = coincidence_rpm(mode.frequency, excitation)
    finding: dict[str, Any] = {
        "mode": mode.number,
        "frequency_hz": mode.frequency,
        "excitation": excitation.name,
        "operation": operation.name,
        "excitation_min_hz": low,
        "excitation_max_hz": high,
        "margin": kept.margin,
        "required": kept.required,
        "verdict": verdict,
        "coincidence_rpm": rpm,
    }
    if excitation.name in mode.participation:
        finding["participation"] = mode.participation[excitation.name]
    finding["reading"] = _sentence(finding, kept, rpm)
    return finding


def _sentence(finding: dict[str, Any], kept: Margin, rpm: float | None) -> str:
    mode = f"Mode {finding['mode']} at {number(finding['frequency_hz'])} Hz"
    band = _band(finding)
    if finding["verdict"] == "unexcited":
        return f"{mode} isn't driven by {finding['excitation']}, which acts where it doesn't move."
    if kept.side == "inside":
        return f"{mode} is met by {band}{_meeting(rpm)}: coincident."
    lies, asked = two_percents(kept.margin, kept.required)
    return (
        f"{mode} lies {lies} {kept.side} {band}; {asked} is required: "
        f"{finding['verdict']}{_meeting(rpm)}."
    )


def _band(finding: dict[str, Any]) -> str:
    low, high = finding["excitation_min_hz"], finding["excitation_max_hz"]
    name, operation = finding["excitation"], finding["operation"]
    if low == high:
        return f"{name} ({number(low)} Hz in {operation})"
    return f"{name} ({number(low)} to {number(high)} Hz in {operation})"


def _meeting(rpm: float | None) -> str:
    return "" if rpm is None else f"; they meet at {number(rpm)} rpm"


def _worst_first(finding: dict[str, Any]) -> tuple[int, float, int]:
    return (
        RANK[finding["verdict"]],
        finding["margin"] - finding["required"],
        finding["mode"],
    )


def _verdict(findings: list[dict[str, Any]]) -> str:
    worst = min((RANK[finding["verdict"]] for finding in findings), default=RANK["clear"])
    return next(name for name, rank in RANK.items() if rank == min(worst, RANK["clear"]))


def _reading(verdict: str, findings: list[dict[str, Any]]) -> str:
    if not findings:
        return "No oscillating mode, so nothing to keep clear of."
    if verdict == "clear":
        return "Every mode keeps its separation from every excitation."
    parts = []
    for kind in ("coincident", "short"):
        pairs = dict.fromkeys(
            f"mode {finding['mode']} with {finding['excitation']}"
            for finding in findings
            if finding["verdict"] == kind
        )
        if pairs:
            shown = list(pairs)[:4] + ([f"{len(pairs) - 4} more"] if len(pairs) > 4 else [])
            parts.append(f"{kind}: {listed(shown)}")
    return f"Separation isn't kept; {'; '.join(parts)}."


def _coincidences(
    modes: list[Candidate], excitations: list[Excitation], operations: list[Operation]
) -> list[dict[str, Any]]:
    highest = max(operation.max_rpm for operation in operations)
    meetings = []
    for mode in modes:
        for excitation in excitations:
            rpm = coincidence_rpm(mode.frequency, excitation)
            if rpm is None or rpm > highest or mode.undriven_by(excitation.name):
                continue
            inside = [o.name for o in operations if o.min_rpm <= rpm <= o.max_rpm]
            meetings.append(
                {
                    "mode": mode.number,
                    "excitation": excitation.name,
                    "rpm": rpm,
                    "operation": inside[0] if inside else None,
                }
            )
    return sorted(meetings, key=lambda meeting: meeting["rpm"])


def _clear_speeds(
    modes: list[Candidate],
    excitations: list[Excitation],
    operations: list[Operation],
    required: Required,
    findings: list[dict[str, Any]],
) -> list[dict[str, float]]:
    """Speeds of the operation at which all findings, taken at that one speed, are clear."""
    fixed = {excitation.name for excitation in excitations if excitation.order is None}
    if any(f["excitation"] in fixed and RANK[f["verdict"]] < RANK["clear"] for f in findings):
        return []
    closed = [
        barred(mode.frequency, excitation, required)
        for mode in modes
        for excitation in excitations
        if excitation.order is not None and not mode.undriven_by(excitation.name)
    ]
    return [
        {"min_rpm": low, "max_rpm": high}
        for start, end in _merged(operations)
        for low, high in free_ranges(start, end, closed)
    ]


def _merged(operations: list[Operation]) -> list[tuple[float, float]]:
    """The union of the ranges of operation."""
    merged: list[tuple[float, float]] = []
    for operation in sorted(operations, key=lambda o: o.min_rpm):
        if merged and operation.min_rpm <= merged[-1][1]:
            merged[-1] = (merged[-1][0], max(merged[-1][1], operation.max_rpm))
        else:
            merged.append((operation.min_rpm, operation.max_rpm))
    return merged


def _warnings(
    findings: list[dict[str, Any]], excitations: list[Excitation], required: Required
) -> list[str]:
    fixed = {excitation.name for excitation in excitations if excitation.order is None}
    at_fault = dict.fromkeys(
        finding["excitation"]
        for finding in findings
        if finding["excitation"] in fixed and RANK[finding["verdict"]] < RANK["clear"]
    )
    warnings = []
    if at_fault:
        warnings.append(
            "no speed is clear, because an excitation of fixed frequency isn't: "
            f"{listed(list(at_fault))}."
        )
    if required.above == 0.0 or required.below == 0.0:
        warnings.append("the rule asks for no margin on one side, so only a coincidence is short.")
    if not findings:
        warnings.append("the system has no oscillating mode.")
    return warnings
