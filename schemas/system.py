"""Descriptions of machines: bodies and connections, or matrices."""

from typing import Annotated, Literal

from pydantic import Discriminator, Field, Tag, model_validator

from schemas.base import Strict, fault
from schemas.quantities import (
    STANDARD_GRAVITY,
    AnyDamping,
    AnyStiffness,
    Damping,
    DegreeOfFreedom,
    End,
    Gravity,
    Inertia,
    InertiaProduct,
    Mass,
    Motions,
    Name,
    Point,
    PositiveLength,
    Rate,
    Ratio,
    RotationalDamping,
    RotationalStiffness,
    Stiffness,
    Time,
)

MOST_BODIES = 20_000
MOST_CONNECTIONS = 100_000


def _number_or_table(value: object) -> str:
    return "per axis" if isinstance(value, dict) or hasattr(value, "model_fields") else "number"


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
        scale = max(a, b, c)
        slack = 1e-12
        pairs_hold = all(
            p * q - r * r >= -slack * scale**2 for p, q, r in ((a, b, d), (b, c, e), (a, c, f))
        )
        determinant = a * (b * c - e * e) - d * (d * c - e * f) + f * (d * e - b * f)
        if not pairs_hold or determinant < -slack * scale**3:
            raise fault("the inertia tensor isn't positive definite: its products are too large")
        return self


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
    Discriminator(_number_or_table),
]
AxisOrNumberDamping = Annotated[
    Annotated[DampingPerAxis, Tag("per axis")] | Annotated[AnyDamping, Tag("number")],
    Discriminator(_number_or_table),
]
TensorOrNumber = Annotated[
    Annotated[InertiaTensor, Tag("per axis")] | Annotated[Inertia, Tag("number")],
    Discriminator(_number_or_table),
]
Between = Annotated[list[End], Field(min_length=2, max_length=2)]
Axes = Annotated[list[Point], Field(min_length=3, max_length=3)]


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


class Spring(Strict):
    """A spring or mount: stiffness, and the damping that comes with it."""

    kind: Literal["spring"]
    """Always "spring"."""
    name: Name
    """Name of the spring, unique over bodies and connections."""
    between: Between
    """Two bodies, or one and "ground"."""
    at: Point | None = None
    """Where it attaches, [x, y, z] in m; the first body's `at` where absent."""
    stiffness: AxisOrNumberStiffness
    """N/m, or N·m/rad about an axis: one number along `along` or the only motion that the bodies
    have, or one per axis."""
    damping: AxisOrNumberDamping | None = None
    """Viscous damping in the same form, N·s/m or N·m·s/rad."""
    loss_factor: Ratio | None = None
    """Structural damping: the imaginary part of the stiffness over its real part (no unit)."""
    along: Point | None = None
    """The direction in which a single number acts, [x, y, z] (any length)."""
    axes: Axes | None = None
    """Rotation of an inclined mount, 3×3: its columns are the mount's own x, y, z in space."""
    destabilising: bool = False
    """Allows a negative stiffness (no unit)."""


class Damper(Strict):
    """A viscous damper."""

    kind: Literal["damper"]
    """Always "damper"."""
    name: Name
    """Name of the damper, unique over bodies and connections."""
    between: Between
    """Two bodies, or one and "ground"."""
    at: Point | None = None
    """Where it attaches, [x, y, z] in m; the first body's `at` where absent."""
    damping: AxisOrNumberDamping
    """N·s/m, or N·m·s/rad about an axis: one number or one per axis."""
    along: Point | None = None
    """The direction in which a single number acts, [x, y, z] (any length)."""
    axes: Axes | None = None
    """Rotation of an inclined damper, 3×3: its columns are its own x, y, z in space."""


class Pendulum(Strict):
    """The hanging of a body from a fixed point: m·g/length in each horizontal translation."""

    kind: Literal["pendulum"]
    """Always "pendulum"."""
    name: Name
    """Name of the pendulum, unique over bodies and connections."""
    body: Name
    """The body that hangs."""
    length: PositiveLength
    """From the fixed point to the body's centre of mass, m."""


class Link(Strict):
    """A rigid tie between two bodies, in the motions that they share or in some of them."""

    kind: Literal["link"]
    """Always "link"."""
    name: Name
    """Name of the link, unique over bodies and connections."""
    between: Between
    """Two bodies, or one and "ground"."""
    at: Point | None = None
    """The point at which the two move together, [x, y, z] in m; the first body's `at` where absent,
    or the second's if only the first can rotate."""
    motions: Motions | None = None
    """The motions that are tied (no unit); all that the two share where absent."""


Connection = Annotated[Spring | Damper | Pendulum | Link, Field(discriminator="kind")]


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
    """The springs, mounts, dampers, pendulums and links."""
    damping: DampingAssumption | None = None
    """An assumption on damping for the whole machine."""


Entry = Annotated[float, Field(strict=True, allow_inf_nan=False, ge=-1e30, le=1e30)]
Matrix = Annotated[list[Annotated[list[Entry], Field(min_length=1)]], Field(min_length=1)]


class MatricesSystem(Strict):
    """A machine as matrices, in the units kg, m, rad, N."""

    kind: Literal["matrices"]
    """Always "matrices"."""
    name: Name | None = None
    """What the machine is called."""
    note: Annotated[str, Field(max_length=4000)] | None = None
    """Free text."""
    degrees_of_freedom: Annotated[list[DegreeOfFreedom], Field(min_length=1)]
    """Names of the degrees of freedom, BODY/MOTION, in the order of the rows."""
    mass: Matrix
    """Mass matrix as a list of rows: kg, kg·m, kg·m². Symmetric, positive semi-definite."""
    stiffness: Matrix
    """Stiffness matrix as a list of rows: N/m, N/rad, N·m/rad. Symmetric."""
    damping: Matrix | None = None
    """Viscous damping matrix as a list of rows: N·s/m, N·s/rad, N·m·s/rad."""
    gyroscopic: Matrix | None = None
    """Gyroscopic matrix per unit of shaft speed as a list of rows: kg, kg·m, kg·m². It is
    multiplied by the shaft's speed in rad/s. Skew-symmetric."""
    structural: Matrix | None = None
    """Imaginary part of the stiffness matrix as a list of rows: N/m, N/rad, N·m/rad."""


System = Annotated[BodiesSystem | MatricesSystem, Field(discriminator="kind")]
AnySystem = BodiesSystem | MatricesSystem
