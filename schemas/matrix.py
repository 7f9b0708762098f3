"""A matrix as a caller writes it: a list of rows, a list of entries, or Matrix Market text."""

from typing import Annotated, Self

from pydantic import Discriminator, Field, Tag, model_validator

from schemas.base import Strict, fault

LARGEST_SIZE = 200_000

Entry = Annotated[float, Field(strict=True, allow_inf_nan=False, ge=-1e30, le=1e30)]
Index = Annotated[int, Field(ge=0, lt=LARGEST_SIZE)]
Rows = Annotated[list[Annotated[list[Entry], Field(min_length=1)]], Field(min_length=1)]


class EntryList(Strict):
    """Entries by row and column, zero-based. Entries at the same place add up."""

    rows: list[Index]
    """Row of each entry (no unit)."""
    columns: list[Index]
    """Column of each entry (no unit)."""
    values: list[Entry]
    """Value of each entry, in kg, m, rad, N."""
    symmetric: bool = False
    """Whether only one triangle (upper or lower) is listed (no unit)."""

    @model_validator(mode="after")
    def _equally_long(self) -> Self:
        for field in ("rows", "columns"):
            if len(getattr(self, field)) != len(self.values):
                raise fault(
                    f"{len(getattr(self, field))} entries, but {len(self.values)} values", field
                )
        return self


class MatrixMarket(Strict):
    """A matrix in the Matrix Market exchange format."""

    matrix_market: str
    """The text, from "%%MatrixMarket matrix …" on: real or integer, general, symmetric or
    skew-symmetric; in kg, m, rad, N."""


def _form(value: object) -> str:
    if isinstance(value, list):
        return "rows"
    names = value if isinstance(value, dict) else getattr(type(value), "model_fields", {})
    return "text" if "matrix_market" in names else "entries"


Matrix = Annotated[
    Annotated[Rows, Tag("rows")]
    | Annotated[EntryList, Tag("entries")]
    | Annotated[MatrixMarket, Tag("text")],
    Discriminator(_form),
]
