"""What both kinds of response have in common: where one looks, and how it comes back."""

from typing import Annotated, Literal

from pydantic import Field

from schemas.base import Answer, Strict
from schemas.quantities import DegreeOfFreedom, Name

ResponseQuantity = Literal["displacement", "velocity", "acceleration"]
SeriesQuantity = Literal["displacement", "velocity", "acceleration", "force", "moment"]
Observed = Annotated[list[DegreeOfFreedom], Field(min_length=1, max_length=200)]
Carriers = Annotated[list[Name], Field(min_length=1, max_length=100)]
MaxPoints = Annotated[int, Field(ge=10, le=200_000)]
Degrees = Annotated[float, Field(strict=True, allow_inf_nan=False, ge=-36_000, le=36_000)]


class Severity(Strict):
    """Asks for the zone of vibration severity by the published standards for machines in place."""

    machine: Literal["large", "medium"]
    """"large": above 300 kW, or an electrical machine with a shaft height of 315 mm or more;
    "medium": 15 to 300 kW, or a shaft height of 160 to 315 mm (no unit)."""
    support: Literal["rigid", "flexible"]
    """How the machine stands (no unit)."""


class SeverityZone(Answer):
    """Overall r.m.s. velocity at one place, against published zone boundaries."""

    at: str
    """Degree of freedom."""
    rms_velocity_mm_s: float | None
    """Overall r.m.s. velocity, mm/s; null where the response is without bound. Of a response over
    frequency: that at its worst frequency."""
    zone: Literal["A", "B", "C", "D"]
    """The zone that it falls in. Zones are a screening by broad experience, not a verdict on
    safety."""
    zone_boundaries_mm_s: list[float]
    """Upper limits of zones A, B and C, r.m.s. velocity in mm/s."""
    source: str
    """Where the boundaries come from, and how far they go."""
