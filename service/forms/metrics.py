"""A separation answer as OpenMetrics gauges, for a collector that polls it."""

from collections.abc import Mapping
from typing import Any

VERDICTS = ("clear", "short", "coincident", "unexcited")


def write(answer: Mapping[str, Any], _: Mapping[str, Any]) -> str:
    """Margin, required margin, frequency and verdict of each finding."""
    lines: list[str] = []
    for name, unit, explanation, field in (
        ("wideberth_separation_margin_ratio", "ratio",
         "Distance of the mode from the excited band over the nearer edge.", "margin"),
        ("wideberth_separation_required_ratio", "ratio",
         "Margin that the rule requires.", "required"),
        ("wideberth_mode_frequency_hertz", "hertz", "Natural frequency.", "frequency_hz"),
    ):  # fmt: skip
        lines += [f"# TYPE {name} gauge", f"# UNIT {name} {unit}", f"# HELP {name} {explanation}"]
        lines += [f"{name}{{{_labels(item)}}} {item[field]!r}" for item in answer["findings"]]
    lines += [
        "# TYPE wideberth_separation_verdict stateset",
        "# HELP wideberth_separation_verdict Verdict on the finding.",
    ]
    for item in answer["findings"]:
        lines += [
            f'wideberth_separation_verdict{{{_labels(item)},wideberth_separation_verdict="{verdict}"}}'
            f" {int(item['verdict'] == verdict)}"
            for verdict in VERDICTS
        ]
    return "\n".join([*lines, "# EOF", ""])


def _labels(item: Mapping[str, Any]) -> str:
    labels = {
        "mode": str(item["mode"]),
        "excitation": item["excitation"],
        "operation": item["operation"],
    }
    return ",".join(f'{name}="{_escaped(value)}"' for name, value in labels.items())


def _escaped(value: str) -> str:
    return value.replace("\\", "\\\\").replace('"', '\\"').replace("\n", "\\n")
