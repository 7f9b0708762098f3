"""Shafts that twist, and gears."""

from typing import Annotated, Literal, Self

from pydantic import Field, model_validator

from schemas.base import Strict, fault
from schemas.connections.ends import Between
from schemas.materials import MaterialName
from schemas.quantities import (
    Density,
    Name,
    NonNegativeLength,
    PositiveLength,
    PositiveRotationalStiffness,
    PositiveStiffness,
    Pressure,
    Ratio,
    RotationalDamping,
    SignedRatio,
)


class ShaftSection(Strict):
    """A cylindrical length of shaft, solid or hollow."""

    length: PositiveLength
    """Length, m."""
    outer_diameter: PositiveLength
    """Outer diameter, m."""
    inner_diameter: NonNegativeLength = 0.0
    """Bore, m."""
    shear_modulus: Pressure | None = None
    """Shear modulus, Pa; that of `material` where absent."""
    material: MaterialName | None = None
    """A material of the service's table (no unit)."""
    density: Density | None = None
    """Density, kg/m³; that of `material` where absent."""

    @model_validator(mode="after")
    def _is_a_tube(self) -> Self:
        if self.inner_diameter >= self.outer_diameter:
            raise fault("must be smaller than the outer diameter", "inner_diameter")
        if self.shear_modulus is None and self.material is None:
            raise fault("shear_modulus or material is needed", "shear_modulus")
        return self


RotationAxis = Literal["rx", "ry", "rz"]


class Shaft(Strict):
    """A shaft that twists between two bodies."""

    kind: Literal["shaft"]
    """Always "shaft"."""
    name: Name
    """Name of the shaft, unique over bodies and connections."""
    between: Between
    """Two bodies, or one and "ground"."""
    stiffness: PositiveRotationalStiffness | None = None
    """Torsional stiffness, N·m/rad."""
    sections: Annotated[list[ShaftSection], Field(min_length=1, max_length=200)] | None = None
    """Or lengths of shaft in series, from the first end to the second."""
    massless: bool = False
    """Leaves the sections' own inertia out (no unit); else it is shared between the two ends."""
    damping: RotationalDamping | None = None
    """Viscous damping, N·m·s/rad."""
    loss_factor: Ratio | None = None
    """Structural damping: the imaginary part of the stiffness over its real part (no unit)."""
    axis: RotationAxis | None = None
    """The rotation that it ties (no unit); where absent the only one that the bodies have, or that
    about the line between their places."""

    @model_validator(mode="after")
    def _one_description(self) -> Self:
        if (self.stiffness is None) == (self.sections is None):
            raise fault("exactly one of stiffness and sections is needed", "stiffness")
        for index, section in enumerate(self.sections or ()):
            if not self.massless and section.density is None and section.material is None:
                raise fault(
                    'density or material is needed, or "massless": true on the shaft',
                    "sections",
                    index,
                    "density",
                )
        return self


class Gear(Strict):
    """A pair of meshing wheels: an exact ratio, or a mesh that gives."""

    kind: Literal["gear"]
    """Always "gear"."""
    name: Name
    """Name of the gear, unique over bodies and connections."""
    between: Between
    """The driver and the driven body."""
    ratio: SignedRatio
    """Speed of the driven over speed of the driver, negative for an external mesh (no unit)."""
    mesh_stiffness: PositiveStiffness | None = None
    """Stiffness of the mesh along the line of action, N/m; rigid where absent."""
    pitch_radius: Annotated[list[PositiveLength], Field(min_length=2, max_length=2)] | None = None
    """Base radii [driver, driven] at which the mesh force acts, m."""
    axis: RotationAxis | None = None
    """The rotation that it ties (no unit); where absent the only one that each body has."""

    @model_validator(mode="after")
    def _agrees(self) -> Self:
        if self.ratio == 0.0:
            raise fault("must not be zero", "ratio")
        if (self.mesh_stiffness is None) != (self.pitch_radius is None):
            raise fault("mesh_stiffness and pitch_radius go together", "pitch_radius")
        if self.pitch_radius is not None:
            driver, driven = self.pitch_radius
            if abs(abs(self.ratio) * driven / driver - 1.0) > 0.01:
                raise fault("the radii don't give this ratio (within 1 %)", "pitch_radius")
        return self
