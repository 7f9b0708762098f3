"""What every task's question has in common."""

from typing import Annotated, Self

from pydantic import Field, model_validator

from schemas.base import Strict, fault
from schemas.system import System

ID_PATTERN = r"^s[0-9a-f]{40}$"


class Question(Strict):
    """Exactly one of `system` and `system_id`, and the task's own options."""

    system: System | None = None
    """The machine, described here."""
    system_id: Annotated[str, Field(pattern=ID_PATTERN)] | None = None
    """Or the id of a machine that was posted to /v1/systems."""

    @model_validator(mode="after")
    def _one_system(self) -> Self:
        if (self.system is None) == (self.system_id is None):
            raise fault("exactly one of system and system_id is needed", "system")
        return self
