"""Springs, dampers, pendulums and rigid links."""

from typing import Literal

from schemas.base import Strict
from schemas.connections.ends import Axes, AxisOrNumberDamping, AxisOrNumberStiffness, Between
from schemas.quantities import Direction, Motions, Name, Point, PositiveLength, Ratio


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
    along: Direction | None = None
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
    along: Direction | None = None
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
