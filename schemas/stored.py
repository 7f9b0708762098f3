"""What comes back for a system that is stored."""

from typing import Literal

from schemas.base import Answer
from schemas.system import System


class SystemSummary(Answer):
    """What a stored system comes to."""

    id: str
    """The system's id: the same content has the same id everywhere."""
    kind: Literal["bodies", "matrices"]
    """How it was described."""
    name: str | None
    """What it is called."""
    degrees_of_freedom: int
    """Motions that aren't held (no unit)."""
    independent_motions: int
    """Motions left when rigid ties and massless motions are eliminated (no unit)."""
    total_mass_kg: float | None
    """Mass of all bodies, kg; null for matrices."""
    centre_of_mass_m: list[float] | None
    """Their centre of mass, [x, y, z] in m; null for matrices, or without mass."""
    rigid_body_motions: int
    """Motions that nothing brings back (no unit)."""
    warnings: list[str]
    """What a careful engineer would question."""


class StoredSystem(SystemSummary):
    """A stored system in its canonical form, and its summary."""

    system: System
    """The system in SI, with every default filled in."""
