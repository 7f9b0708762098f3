"""The task `separation`: does every mode keep clear of everything that excites the machine?"""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from schemas.faults import Fault, Invalid
from schemas.separation import AmplificationRule, FractionRule, Operation, SeparationQuestion
from schemas.system import AnySystem
from service.compute.separation import (
    Excitation,
    Margin,
    Required,
    free_ranges,
    margin,
    required_by_amplification,
)
from service.tasks.candidates import Candidate, candidates_of
from service.tasks.modes import CAUTION
from service.tasks.readings import listed, number, two_percents

TORSIONAL = Required(0.1, 0.1)
TORSIONAL_SOURCE = "API 617, torsional separation of 10 % (from memory)"
AMPLIFICATION_SOURCE = (
    "API 617 (7th edition), lateral separation by amplification factor (from memory)"
)
RANK = {"coincident": 0, "short": 1, "clear": 2, "unexcited": 3}


def separation(system: AnySystem, question: SeparationQuestion) -> dict[str, Any]:
    """Answer a question on separation.

    Raises
    ------
    Invalid
        The system can't be computed, or `forces_at` names no motion of it; pointers start at the
        question.
    """
    rule = rule_of(question)
    excitations = [
        Excitation(
            item.name,
            None if item.order is None else item.order * (item.shaft_ratio or 1.0),
            item.frequency_hz,
        )
        for item in question.excitations
    ]
    top = max(_top(item, question.operation) for item in excitations) * (1.0 + rule.largest)
    try:
        found = candidates_of(system, question, top)
    except Invalid as fault:
        raise fault.under("/system") from None
    if isinstance(question.rule, AmplificationRule) and not found.damped:
        raise Invalid([Fault("/rule", "this rule needs damping, and the system has none")])
    modes = _reachable(found.modes, excitations, question.operation, top)
    findings = [
        _finding(mode, excitation, operation, rule)
        for mode in modes
        for excitation in excitations
        for operation in question.operation
    ]
    findings.sort(key=_worst_first)
    verdict = _verdict(findings)
    return {
        "verdict": verdict,
        "reading": _reading(verdict, findings),
        "findings": findings,
        "coincidences": _coincidences(modes, excitations, question.operation),
        "clear_speeds": _clear_speeds(modes, excitations, question.operation, rule),
        "warnings": [*found.warnings, *_warnings(findings, excitations, rule)],
        "evidence": found.evidence,
        "caution": CAUTION,
    }


@dataclass(frozen=True, slots=True)
class Margins:
    """What a rule requires of a mode with a damping ratio; `largest` bounds it."""

    of: Callable[[float], Required]
    largest: float
    source: str | None = None


def rule_of(question: SeparationQuestion) -> Margins:
    """The margins that the rule of the question asks for."""
    rule = question.rule
    if isinstance(rule, FractionRule):
        fixed = Required(rule.mode_above, rule.mode_below)
        return Margins(lambda _: fixed, rule.mode_above)
    if isinstance(rule, AmplificationRule):
        return Margins(required_by_amplification, 0.27, AMPLIFICATION_SOURCE)
    return Margins(lambda _: TORSIONAL, TORSIONAL.above, TORSIONAL_SOURCE)


def _top(excitation: Excitation, operations: list[Operation]) -> float:
    return max(excitation.band(item.min_rpm, item.max_rpm)[1] for item in operations)


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
    mode: Candidate, excitation: Excitation, operation: Operation, rule: Margins
) -> dict[str, Any]:
    low, high = excitation.band(operation.min_rpm, operation.max_rpm)
    met = mode.meet(excitation, operation.min_rpm, operation.max_rpm)
    kept = margin(met.frequency, low, high, rule.of(met.damping_ratio))
    if mode.undriven_by(excitation.name):
        verdict = "unexcited"
    elif rule.source == AMPLIFICATION_SOURCE and kept.required == 0.0:
        verdict = "clear"  # critically damped: it amplifies nothing
    elif kept.side == "inside":
        verdict = "coincident"
    else:
        verdict = "clear" if kept.is_kept else "short"
    finding: dict[str, Any] = {
        "mode": mode.number,
        "frequency_hz": met.frequency,
        "excitation": excitation.name,
        "operation": operation.name,
        "excitation_min_hz": low,
        "excitation_max_hz": high,
        "margin": kept.margin,
        "required": kept.required,
        "verdict": verdict,
        "coincidence_rpm": met.rpm,
    }
    if mode.damped:
        finding["damping_ratio"] = met.damping_ratio
        ratio = met.damping_ratio
        finding["amplification_factor"] = 1.0 / (2.0 * ratio) if ratio > 1e-12 else None
    if excitation.name in mode.participation:
        finding["participation"] = mode.participation[excitation.name]
    finding["reading"] = _sentence(finding, kept, met.rpm)
    return finding


def _sentence(finding: dict[str, Any], kept: Margin, rpm: float | None) -> str:
    mode = f"Mode {finding['mode']} at {number(finding['frequency_hz'])} Hz"
    band = _band(finding)
    if finding["verdict"] == "unexcited":
        return f"{mode} isn't driven by {finding['excitation']}, which acts where it doesn't move."
    if finding["verdict"] == "clear" and kept.required == 0.0 and "damping_ratio" in finding:
        factor = number(finding["amplification_factor"] or 0.0, 3)
        return f"{mode} is so damped that {band} isn't amplified (factor {factor}): clear."
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
            if mode.undriven_by(excitation.name):
                continue
            for rpm in mode.meetings(excitation):
                if rpm > highest:
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
    rule: Margins,
) -> list[dict[str, float]]:
    """Speeds of the operation at which all findings, taken at that one speed, are clear."""
    closed = [
        barred
        for mode in modes
        for excitation in excitations
        if not mode.undriven_by(excitation.name)
        for barred in mode.barred(excitation, rule.of)
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
    findings: list[dict[str, Any]], excitations: list[Excitation], rule: Margins
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
            "changing the speed doesn't clear an excitation of fixed frequency: "
            f"{listed(list(at_fault))}."
        )
    asked = rule.of(0.0)
    if asked.above == 0.0 or asked.below == 0.0:
        warnings.append("the rule asks for no margin on one side, so only a coincidence is short.")
    if rule.source is not None:
        warnings.append(f"margins required by {rule.source}.")
    if not findings:
        warnings.append("the system has no oscillating mode.")
    return warnings
