"""Footings on soil or elastomer."""

from typing import Annotated, Literal, Self

from pydantic import Field, model_validator

from schemas.base import Strict, fault
from schemas.connections.ends import Between
from schemas.quantities import Density, Name, Point, PositiveLength, Pressure, Ratio


class CircleFooting(Strict):
    """A round footing."""

    kind: Literal["circle"]
    """Always "circle"."""
    radius: PositiveLength
    """Radius, m."""


class RectangleFooting(Strict):
    """A rectangular footing."""

    kind: Literal["rectangle"]
    """Always "rectangle"."""
    length: PositiveLength
    """Along x, m."""
    width: PositiveLength
    """Along y, m."""


class Pad(Strict):
    """A block or footing on soil or elastomer, as a rigid plate on an elastic half-space."""

    kind: Literal["pad"]
    """Always "pad"."""
    name: Name
    """Name of the pad, unique over bodies and connections."""
    between: Between
    """Two bodies, or one and "ground"."""
    at: Point | None = None
    """Middle of the footing, [x, y, z] in m; the first body's `at` where absent."""
    footing: Annotated[CircleFooting | RectangleFooting, Field(discriminator="kind")]
    """Its shape."""
    shear_modulus: Pressure
    """Shear modulus of the ground, Pa."""
    poissons_ratio: Ratio
    """Poisson's ratio of the ground, less than 0.5 (no unit)."""
    density: Density
    """Density of the ground, kg/m³."""

    @model_validator(mode="after")
    def _can_be(self) -> Self:
        if self.poissons_ratio >= 0.5:
            raise fault("must be less than 0.5", "poissons_ratio")
        return self
