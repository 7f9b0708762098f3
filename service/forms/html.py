"""An answer as a page without outside resources."""

from collections.abc import Mapping
from functools import cache
from typing import Any

from jinja2 import Environment, PackageLoader, StrictUndefined

from service.forms.text import evidence_lines, shown

MOST_ROWS = 2000


def write(answer: Mapping[str, Any], tables: Mapping[str, Any]) -> str:
    """All `tables`, then warnings, evidence and caution."""
    return render(
        "answer.html",
        title=f"{answer['task'].replace('/', ' ').capitalize()} of a machine",
        answer=answer,
        tables=[_shown(table, answer) for table in tables.values()],
        evidence=evidence_lines(answer["evidence"]),
    )


def _shown(table: Any, answer: Mapping[str, Any]) -> dict[str, Any]:
    """A table's cells, without columns in which nothing stands."""
    rows = list(table.rows(answer))[:MOST_ROWS]
    kept = [
        place
        for place in range(len(table.columns))
        if not rows or any(row[place] is not None for row in rows)
    ]
    names = [table.columns[place] for place in kept]
    return {
        "title": table.title,
        "columns": names,
        "rows": [[_cell(table.columns[place], row[place]) for place in kept] for row in rows],
    }


def _cell(name: str, cell: object) -> dict[str, str]:
    if name == "reading":
        return {"kind": "s", "text": str(cell)}
    is_number = isinstance(cell, int | float) and not isinstance(cell, bool)
    return {"kind": "n" if is_number else "w", "text": shown(cell)}


def render(template: str, **values: Any) -> str:
    """A page from a template of this package, everything escaped."""
    return _environment().get_template(template).render(**values)


@cache
def _environment() -> Environment:
    return Environment(
        loader=PackageLoader("service", "forms"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
    )
