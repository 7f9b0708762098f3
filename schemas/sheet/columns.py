"""What a column may hold, from the models of the contract."""

import types
from dataclasses import dataclass, field
from functools import cache
from typing import Annotated, Any, Literal, Union, get_args, get_origin, get_type_hints

from pydantic import BaseModel
from pydantic.fields import FieldInfo

from schemas.quantities import Quantity
from schemas.sheet.places import Path

AXES = ("x", "y", "z")


@dataclass(slots=True)
class Content:
    """What may stand at one place of a document: all alternatives of its type together.

    Attributes
    ----------
    models : objects, by the models that describe them
    items : what a list holds, where it may be a list
    length : the fixed length of that list
    values : what an object with free keys holds
    """

    text: bool = False
    number: bool = False
    whole: bool = False
    boolean: bool = False
    quantities: list[Quantity] = field(default_factory=list)
    models: list[type[BaseModel]] = field(default_factory=list)
    items: "Content | None" = None
    length: int | None = None
    values: "Content | None" = None

    @property
    def scalar(self) -> bool:
        """Whether one cell holds it."""
        return self.text or self.number or self.boolean

    @property
    def listed(self) -> bool:
        """Whether one cell may hold a list of it."""
        return self.items is not None and self.items.scalar

    def join(self, other: "Content") -> None:
        """Take in the alternatives of `other`."""
        self.text |= other.text
        self.number |= other.number
        self.whole |= other.whole
        self.boolean |= other.boolean
        self.quantities += other.quantities
        self.models += other.models
        self.length = self.length or other.length
        self.items = _both(self.items, other.items)
        self.values = _both(self.values, other.values)


def _both(one: Content | None, other: Content | None) -> Content | None:
    if one is None or other is None:
        return one or other
    both = Content()
    both.join(one)
    both.join(other)
    return both


def content(annotation: Any, constraints: tuple[Any, ...] = ()) -> Content:
    """What a type of the contract may hold."""
    origin, arguments = get_origin(annotation), get_args(annotation)
    if origin is Annotated:
        return content(arguments[0], (*constraints, *arguments[1:]))
    if origin in (Union, types.UnionType):
        found = Content()
        for alternative in arguments:
            found.join(content(alternative))
        return found
    if origin is list:
        return Content(items=content(arguments[0]), length=_length(constraints))
    if origin is dict:
        return Content(values=content(arguments[1]))
    if origin is Literal:
        return content(type(arguments[0]))
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return Content(models=[annotation])
    return Content(
        text=annotation is str,
        number=annotation in (int, float),
        whole=annotation is int,
        boolean=annotation is bool,
        quantities=[known for known in constraints if isinstance(known, Quantity)],
    )


def _length(constraints: tuple[Any, ...]) -> int | None:
    """The length of a list, where it is fixed."""
    limits: dict[str, int] = {}
    for constraint in constraints:
        for part in constraint.metadata if isinstance(constraint, FieldInfo) else [constraint]:
            for bound in ("min_length", "max_length"):
                if getattr(part, bound, None) is not None:
                    limits[bound] = getattr(part, bound)
    low, high = limits.get("min_length"), limits.get("max_length")
    return high if low == high else None


@cache
def fields(model: type[BaseModel]) -> dict[str, Content]:
    """What each field of a model may hold."""
    hints = get_type_hints(model, include_extras=True)
    return {name: content(hints[name]) for name in model.model_fields}


def find(root: Content, title: str) -> tuple[Path, Content] | None:
    """Path and content of the column with this title, or None where there is no such field.

    `.` leads inwards. Items of a list are counted from 0; those of a point or a direction are also
    called x, y and z.
    """
    path: list[str | int] = []
    here, rest = root, title
    while rest:
        token, _, behind = rest.partition(".")
        step = _step(here, token)
        if step is None and here.values is not None:
            return (*path, rest), here.values
        if step is None:
            return None
        key, here = step
        path.append(key)
        rest = behind
    return (tuple(path), here) if path and not title.endswith(".") else None


def _step(here: Content, token: str) -> tuple[str | int, Content] | None:
    named = [fields(model)[token] for model in here.models if token in fields(model)]
    if named:
        found = Content()
        for alternative in named:
            found.join(alternative)
        return token, found
    if here.items is None:
        return None
    if here.length == len(AXES) and token in AXES:
        return AXES.index(token), here.items
    if token.isascii() and token.isdigit() and len(token) <= 6:
        return int(token), here.items
    return None
