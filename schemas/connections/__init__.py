"""The parts between bodies. `between` names two bodies, or one and "ground"."""

from typing import Annotated

from pydantic import Field

from schemas.connections.beam import Beam
from schemas.connections.bearing import Bearing
from schemas.connections.mounts import Damper, Link, Pendulum, Spring
from schemas.connections.pad import Pad
from schemas.connections.trains import Gear, Shaft

Connection = Annotated[
    Spring | Damper | Pendulum | Link | Shaft | Gear | Beam | Bearing | Pad,
    Field(discriminator="kind"),
]

__all__ = [
    "Beam",
    "Bearing",
    "Connection",
    "Damper",
    "Gear",
    "Link",
    "Pad",
    "Pendulum",
    "Shaft",
    "Spring",
]
