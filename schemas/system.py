"""Descriptions of machines: bodies and connections, or matrices."""

from typing import Annotated, Literal

from pydantic import Discriminator, Field, Tag, model_validator

from schemas.base import Strict, fault
from schemas.connections import Connection
from schemas.connections.ends import number_or_table
from schemas.matrix import LARGEST_SIZE, Matrix
from schemas.quantities import (
    STANDARD_GRAVITY,
    DegreeOfFreedom,
    Gravity,
    Inertia,
    InertiaProduct,
    Mass,
    Motions,
    Name,
    Point,
    Rate,
    Ratio,
    SignedRatio,
    Time,
)

MOST_BODIES = 20_000
MOST_CONNECTIONS = 100_000


class InertiaTensor(Strict):
    """The inertia tensor about the centre of mass, kg·m². Products are the tensor's own entries."""

    xx: Inertia = 0.0
    """∫(y² + z²) dm, kg·m²."""
    yy: Inertia = 0.0
    """∫(x² + z²) dm, kg·m²."""
    zz: Inertia = 0.0
    """∫(x² + y²) dm, kg·m²."""
    xy: InertiaProduct = 0.0
    """−∫xy dm, kg·m²."""
    yz: InertiaProduct = 0.0
    """−∫yz dm, kg·m²."""
    xz: InertiaProduct = 0.0
    """−∫xz dm, kg·m²."""

    @model_validator(mode="after")
    def _is_positive_semidefinite(self) -> "InertiaTensor":
        """Sylvester's criterion with every principal minor, so that a thin rod (xx = 0) passes."""
        a, b, c, d, e, f = self.xx, self.yy, self.zz, self.xy, self.yz, self.xz
        slack = 1e-12
        pairs_hold = all(
            r * r <= (1 + slack) * p * q for p, q, r in ((a, b, d), (b, c, e), (a, c, f))
        )
        determinant = a * (b * c - e * e) - d * (d * c - e * f) + f * (d * e - b * f)
        if not pairs_hold or determinant < -slack * a * b * c:
            raise fault("the inertia tensor isn't positive definite: its products are too large")
        return self


TensorOrNumber = Annotated[
    Annotated[InertiaTensor, Tag("per axis")] | Annotated[Inertia, Tag("number")],
    Discriminator(number_or_table),
]


class Spin(Strict):
    """How a body or a beam turns with the machine's shaft."""

    axis: Literal["x", "y", "z"]
    """The axis that it turns about (no unit)."""
    ratio: SignedRatio = 1.0
    """Its speed over the speed of the shaft, negative for the other way round (no unit)."""


class Body(Strict):
    """A rigid body, or with no mass a point where connections meet."""

    name: Name
    """Name of the body, unique over bodies and connections."""
    at: Point = [0.0, 0.0, 0.0]
    """Where its centre of mass is, [x, y, z] in m."""
    mass: Mass = 0.0
    """Mass, kg. 0 makes it a massless point."""
    inertia: TensorOrNumber | None = None
    """Mass moment of inertia about the centre of mass, kg·m²: a number where the body has one
    rotation, else the tensor."""
    motions: Motions | None = None
    """The motions it can make (no unit); the system's `motions` where absent."""
    held: Motions = []
    """Those of its motions that are fixed to ground (no unit)."""
    spin: Spin | None = None
    """How it turns with the machine's shaft; gives gyroscopic terms."""


class ModalDamping(Strict):
    """The same damping ratio in every mode."""

    kind: Literal["modal"]
    """Always "modal"."""
    ratio: Ratio
    """Fraction of critical damping (no unit)."""


class RayleighDamping(Strict):
    """Damping proportional to mass and stiffness, C = αM + βK (Rayleigh)."""

    kind: Literal["rayleigh"]
    """Always "rayleigh"."""
    alpha: Rate = 0.0
    """α, 1/s."""
    beta: Time = 0.0
    """β, s."""


DampingAssumption = Annotated[ModalDamping | RayleighDamping, Field(discriminator="kind")]


class BodiesSystem(Strict):
    """A machine as bodies and the connections between them."""

    kind: Literal["bodies"]
    """Always "bodies"."""
    name: Name | None = None
    """What the machine is called."""
    note: Annotated[str, Field(max_length=4000)] | None = None
    """Free text."""
    motions: Motions = ["x", "y", "z", "rx", "ry", "rz"]
    """The motions of every body that doesn't give its own (no unit)."""
    gravity: Gravity = STANDARD_GRAVITY
    """Gravitational acceleration along −z, m/s²."""
    bodies: Annotated[list[Body], Field(min_length=1, max_length=MOST_BODIES)]
    """The bodies."""
    connections: Annotated[list[Connection], Field(max_length=MOST_CONNECTIONS)] = []
    """What ties the bodies to each other and to ground."""
    damping: DampingAssumption | None = None
    """An assumption on damping for the whole machine."""


class MatricesSystem(Strict):
    """A machine as matrices, in the units kg, m, rad, N."""

    kind: Literal["matrices"]
    """Always "matrices"."""
    name: Name | None = None
    """What the machine is called."""
    note: Annotated[str, Field(max_length=4000)] | None = None
    """Free text."""
    degrees_of_freedom: Annotated[
        list[DegreeOfFreedom], Field(min_length=1, max_length=LARGEST_SIZE)
    ]
    """Names of the degrees of freedom, BODY/MOTION, in the order of the rows."""
    mass: Matrix
    """Mass matrix: kg, kg·m, kg·m². Symmetric, positive semi-definite."""
    stiffness: Matrix
    """Stiffness matrix: N/m, N/rad, N·m/rad. Symmetric."""
    damping: Matrix | None = None
    """Viscous damping matrix: N·s/m, N·s/rad, N·m·s/rad."""
    gyroscopic: Matrix | None = None
    """Gyroscopic matrix per unit of shaft speed: kg, kg·m, kg·m². It is
    multiplied by the shaft's speed in rad/s. Skew-symmetric."""
    structural: Matrix | None = None
    """Imaginary part of the stiffness matrix: N/m, N/rad, N·m/rad."""


System = Annotated[BodiesSystem | MatricesSystem, Field(discriminator="kind")]
AnySystem = BodiesSystem | MatricesSystem
