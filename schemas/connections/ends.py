"""What every connection has: its two ends, and values that may differ per axis."""

from typing import Annotated

from pydantic import BaseModel, Discriminator, Field, Tag

from schemas.base import Strict
from schemas.quantities import (
    AnyDamping,
    AnyStiffness,
    Damping,
    Direction,
    End,
    RotationalDamping,
    RotationalStiffness,
    Stiffness,
)


def number_or_table(value: object) -> str:
    return "per axis" if isinstance(value, dict | BaseModel) else "number"


class StiffnessPerAxis(Strict):
    """Stiffness along and about the connection's own axes."""

    x: Stiffness = 0.0
    """Along x, N/m."""
    y: Stiffness = 0.0
    """Along y, N/m."""
    z: Stiffness = 0.0
    """Along z, N/m."""
    rx: RotationalStiffness = 0.0
    """About x, N·m/rad."""
    ry: RotationalStiffness = 0.0
    """About y, N·m/rad."""
    rz: RotationalStiffness = 0.0
    """About z, N·m/rad."""


class DampingPerAxis(Strict):
    """Viscous damping along and about the connection's own axes."""

    x: Damping = 0.0
    """Along x, N·s/m."""
    y: Damping = 0.0
    """Along y, N·s/m."""
    z: Damping = 0.0
    """Along z, N·s/m."""
    rx: RotationalDamping = 0.0
    """About x, N·m·s/rad."""
    ry: RotationalDamping = 0.0
    """About y, N·m·s/rad."""
    rz: RotationalDamping = 0.0
    """About z, N·m·s/rad."""


AxisOrNumberStiffness = Annotated[
    Annotated[StiffnessPerAxis, Tag("per axis")] | Annotated[AnyStiffness, Tag("number")],
    Discriminator(number_or_table),
]
AxisOrNumberDamping = Annotated[
    Annotated[DampingPerAxis, Tag("per axis")] | Annotated[AnyDamping, Tag("number")],
    Discriminator(number_or_table),
]
Between = Annotated[list[End], Field(min_length=2, max_length=2)]
Axes = Annotated[list[Direction], Field(min_length=3, max_length=3)]
