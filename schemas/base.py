"""The habits that every model of the contract shares."""

from pydantic import BaseModel, ConfigDict
from pydantic_core import PydanticCustomError


class Strict(BaseModel):
    """A model that refuses unknown fields and converts nothing in silence."""

    model_config = ConfigDict(
        extra="forbid", strict=True, frozen=True, allow_inf_nan=False, use_attribute_docstrings=True
    )


class Answer(BaseModel):
    """Part of an answer: it documents what comes back, and tests hold answers to it."""

    model_config = ConfigDict(extra="forbid", strict=True, use_attribute_docstrings=True)


def fault(detail: str, *at: str | int) -> PydanticCustomError:
    """The error that a validator raises; `at` is where, below the place that is validated."""
    return PydanticCustomError("fault", "{detail}", {"detail": detail, "at": list(at)})
