"""Beams with mass of their own."""

from typing import Annotated, Literal, Self

from pydantic import Field, model_validator

from schemas.base import Strict, fault
from schemas.connections.ends import Between
from schemas.materials import MaterialName
from schemas.quantities import (
    Area,
    Density,
    Force,
    Name,
    Point,
    PositiveLength,
    Pressure,
    Ratio,
    SecondMoment,
    SignedRatio,
)


class RoundSection(Strict):
    """A solid round bar."""

    kind: Literal["round"]
    """Always "round"."""
    diameter: PositiveLength
    """Diameter, m."""


class TubeSection(Strict):
    """A round tube."""

    kind: Literal["tube"]
    """Always "tube"."""
    outer_diameter: PositiveLength
    """Outer diameter, m."""
    inner_diameter: PositiveLength
    """Inner diameter, m."""

    @model_validator(mode="after")
    def _is_a_tube(self) -> Self:
        if self.inner_diameter >= self.outer_diameter:
            raise fault("must be smaller than the outer diameter", "inner_diameter")
        return self


class RectangleSection(Strict):
    """A solid rectangle."""

    kind: Literal["rectangle"]
    """Always "rectangle"."""
    width: PositiveLength
    """Along the section's y, m."""
    height: PositiveLength
    """Along the section's z, m."""


class PropertiesSection(Strict):
    """A section by its properties about its own y and z through the centroid."""

    kind: Literal["properties"]
    """Always "properties"."""
    area: Area
    """Area, m²."""
    iy: SecondMoment
    """∫z² dA: resists bending in the section's z, m⁴."""
    iz: SecondMoment
    """∫y² dA: resists bending in the section's y, m⁴."""
    j: SecondMoment
    """Torsion constant, m⁴."""
    shear_area_y: Area | None = None
    """Area that carries shear in y, m²."""
    shear_area_z: Area | None = None
    """Area that carries shear in z, m²."""


BeamSection = Annotated[
    RoundSection | TubeSection | RectangleSection | PropertiesSection, Field(discriminator="kind")
]


class Beam(Strict):
    """A straight beam of constant section between two bodies, with mass of its own."""

    kind: Literal["beam"]
    """Always "beam"."""
    name: Name
    """Name of the beam, unique over bodies and connections; its inner points are
    NAME.1, NAME.2 and so on."""
    between: Between
    """Two bodies at different places."""
    section: BeamSection
    """Its cross-section."""
    material: MaterialName | None = None
    """A material of the service's table (no unit)."""
    youngs_modulus: Pressure | None = None
    """Young's modulus, Pa; that of `material` where absent."""
    density: Density | None = None
    """Density, kg/m³; that of `material` where absent."""
    poissons_ratio: Ratio | None = None
    """Poisson's ratio (no unit); that of `material` where absent, else 0.3."""
    elements: Annotated[int, Field(ge=1, le=500)] = 4
    """How many elements it is cut into (no unit)."""
    theory: Literal["bernoulli", "timoshenko"] = "bernoulli"
    """Without or with shear deformation and rotary inertia (no unit)."""
    axial_force: Force = 0.0
    """Static axial force, N; tension is positive."""
    spin_ratio: SignedRatio = 0.0
    """The section turns about the beam's axis at this times the speed of the shaft (no unit); gives
    gyroscopic terms."""
    up: Point | None = None
    """A direction in whose plane with the beam the section's y lies; the space's y where absent,
    −x for a beam along y."""

    @model_validator(mode="after")
    def _is_complete(self) -> Self:
        for field in ("youngs_modulus", "density"):
            if getattr(self, field) is None and self.material is None:
                raise fault(f"{field} or material is needed", field)
        if self.poissons_ratio is not None and self.poissons_ratio > 0.5:
            raise fault("must not exceed 0.5", "poissons_ratio")
        section = self.section
        if self.theory == "timoshenko" and isinstance(section, PropertiesSection):
            for field in ("shear_area_y", "shear_area_z"):
                if getattr(section, field) is None:
                    raise fault("needed for the theory 'timoshenko'", "section", field)
        return self
