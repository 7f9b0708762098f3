"""Bearings: coefficients in the two lateral axes, constant or over speed."""

from typing import Annotated, Literal, Self

from pydantic import Field, model_validator

from schemas.base import Strict, fault
from schemas.connections.ends import Between
from schemas.quantities import Name, Point, SignedDamping, Speed, Stiffness

StiffnessRow = Annotated[list[Stiffness], Field(min_length=2, max_length=2)]
DampingRow = Annotated[list[SignedDamping], Field(min_length=2, max_length=2)]
StiffnessPair = Annotated[list[StiffnessRow], Field(min_length=2, max_length=2)]
DampingPair = Annotated[list[DampingRow], Field(min_length=2, max_length=2)]


class BearingPoint(Strict):
    """A bearing's coefficients at one speed."""

    rpm: Speed
    """Shaft speed, rpm."""
    stiffness: StiffnessPair
    """[[kyy, kyz], [kzy, kzz]], N/m."""
    damping: DampingPair | None = None
    """[[cyy, cyz], [czy, czz]], N·s/m."""


class Bearing(Strict):
    """A journal or rolling bearing: stiffness and damping in the two lateral axes, which may
    couple."""

    kind: Literal["bearing"]
    """Always "bearing"."""
    name: Name
    """Name of the bearing, unique over bodies and connections."""
    between: Between
    """Two bodies, or one and "ground"."""
    at: Point | None = None
    """Where it sits, [x, y, z] in m; the first body's `at` where absent."""
    points: Annotated[list[BearingPoint], Field(min_length=1, max_length=500)] | None = None
    """Coefficients over shaft speed, in ascending order of speed."""
    stiffness: StiffnessPair | None = None
    """Or one constant set: [[kyy, kyz], [kzy, kzz]], N/m."""
    damping: DampingPair | None = None
    """Damping of the constant set: [[cyy, cyz], [czy, czz]], N·s/m."""
    axis: Literal["x", "y", "z"] = "x"
    """The shaft's direction (no unit); the lateral axes are the other two in cyclic order: y z, z x
    or x y."""

    @model_validator(mode="after")
    def _one_description(self) -> Self:
        if (self.points is None) == (self.stiffness is None):
            raise fault("exactly one of points and stiffness is needed", "points")
        if self.points is not None and self.damping is not None:
            raise fault("damping goes with the constant set, not with points", "damping")
        speeds = [point.rpm for point in self.points or ()]
        for index in range(1, len(speeds)):
            if speeds[index] <= speeds[index - 1]:
                raise fault("speeds must ascend", "points", index, "rpm")
        return self
