"""An answer as plain text: aligned columns, then what it rests on."""

from collections.abc import Mapping, Sequence
from typing import Any

WIDEST = 60
SHORT = 24  # rows: a longer table after the first one is only named


def write(answer: Mapping[str, Any], tables: Mapping[str, Any]) -> str:
    """The first of `tables` and the short ones, then readings, warnings, evidence and caution."""
    first, *others = tables.items()
    lines = [f"{answer['task']} of {answer['system_id']}", ""]
    if "verdict" in answer:
        lines += [f"verdict: {answer['verdict']}", answer.get("reading", ""), ""]
    lines += aligned(first[1].title, *without_readings(first[1], answer))
    for name, table in others:
        lines += ["", *_other(name, table, answer)]
    readings = [item["reading"] for item in answer.get(first[0], []) if "reading" in item]
    for title, sentences in (("Readings", readings), ("Warnings", answer["warnings"])):
        if sentences:
            lines += ["", title, *(f"- {sentence}" for sentence in sentences)]
    lines += ["", "Evidence", *(f"- {said}" for said in evidence_lines(answer["evidence"]))]
    return "\n".join([*lines, "", answer["caution"], f"answer {answer['id']}", ""])


def _other(name: str, table: Any, answer: Mapping[str, Any]) -> list[str]:
    """A further table, or where to find it if it is long."""
    columns, rows = without_readings(table, answer)
    if len(rows) > SHORT:
        return [table.title, f"({len(rows)} rows: ask for ?table={name})"]
    return aligned(table.title, columns, rows)


def without_readings(
    table: Any, answer: Mapping[str, Any]
) -> tuple[list[str], list[Sequence[object]]]:
    """Columns and rows of a table without its sentences, and without columns that are empty."""
    rows = [list(row) for row in table.rows(answer)]
    kept = [
        place
        for place, name in enumerate(table.columns)
        if name != "reading" and (not rows or any(row[place] is not None for row in rows))
    ]
    return [table.columns[place] for place in kept], [
        [row[place] for place in kept] for row in rows
    ]


def aligned(title: str, columns: Sequence[str], rows: Sequence[Sequence[object]]) -> list[str]:
    """Lines of a table: numbers to the right, words to the left."""
    cells = [[shown(cell) for cell in row] for row in rows]
    widths = [
        max([len(name), *(len(row[place]) for row in cells)]) for place, name in enumerate(columns)
    ]
    numeric = [
        all(isinstance(row[place], int | float | None) for row in rows)
        for place in range(len(columns))
    ]

    def line(parts: Sequence[str]) -> str:
        padded = [
            part.rjust(width) if is_number else part.ljust(width)
            for part, width, is_number in zip(parts, widths, numeric, strict=True)
        ]
        return "  ".join(padded).rstrip()

    head = [title, line(columns), line(["-" * width for width in widths])]
    return head + ([line(row) for row in cells] or ["(none)"])


def shown(cell: object) -> str:
    """A cell for people: six significant digits."""
    if cell is None:
        return ""
    if isinstance(cell, float):
        return f"{cell:.6g}"
    return str(cell)[:WIDEST]


def evidence_lines(evidence: Mapping[str, Any]) -> list[str]:
    """Name and value of each piece of evidence."""
    return [f"{name.replace('_', ' ')}: {plain(value)}" for name, value in evidence.items()]


def plain(value: object) -> str:
    """A value of the evidence in words."""
    if value is None:
        return "not taken here"
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, list):
        return "; ".join(plain(item) for item in value)
    return f"{value:.3g}" if isinstance(value, float) else str(value)
