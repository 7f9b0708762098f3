"""An answer as a page without outside resources."""

from collections.abc import Mapping
from functools import cache
from typing import Any

from jinja2 import Environment, PackageLoader, StrictUndefined

from service.forms.text import evidence_lines, shown

MOST_ROWS = 2000


def write(answer: Mapping[str, Any], tables: Mapping[str, Any]) -> str:
    """All `tables`, then warnings, evidence and caution."""
    shown_tables = [
        {
            "title": table.title,
            "columns": table.columns,
            "rows": [
                [_cell(name, cell) for name, cell in zip(table.columns, row, strict=True)]
                for row in list(table.rows(answer))[:MOST_ROWS]
            ],
        }
        for table in tables.values()
    ]
    return render(
        "answer.html",
        title=f"{answer['task'].replace('/', ' ').capitalize()} of a machine",
        answer=answer,
        tables=shown_tables,
        evidence=evidence_lines(answer["evidence"]),
    )


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
