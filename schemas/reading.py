"""From bytes to validated models, with every fault found reported at once."""

import json
from collections.abc import Callable, Iterable
from functools import cache
from typing import Any, TypeVar

import jiter
from pydantic import BaseModel, TypeAdapter, ValidationError
from pydantic_core import ErrorDetails

from schemas.faults import Fault, Invalid, Malformed, pointer
from schemas.references import fill_defaults, normalize_names, system_faults
from schemas.system import AnySystem, System

M = TypeVar("M", bound=BaseModel)
Path = tuple[str | int, ...]


def parse_json(data: bytes) -> Any:
    """The value of a JSON text (RFC 8259).

    Raises
    ------
    Malformed
        Not JSON, not UTF-8, nested too deeply, NaN or Infinity (pointers name where), or keys
        that stand twice in one object (pointers name all of them).
    """
    if not data.strip():
        raise Malformed([Fault("", "the body is empty: a JSON object is expected")])
    try:
        return jiter.from_json(
            data, allow_inf_nan=False, catch_duplicate_keys=True, cache_mode="keys"
        )
    except ValueError as error:
        raise Malformed(_what_is_malformed(data, str(error))) from None


def _what_is_malformed(data: bytes, message: str) -> list[Fault]:
    """Parse again, slowly, for pointers to keys that stand twice and to numbers that aren't."""
    try:
        text = data.decode()
    except UnicodeDecodeError as error:
        return [Fault("", f"the body isn't UTF-8: byte {error.start} can't be read")]
    faults: list[Fault] = []
    try:
        found = json.loads(text, object_pairs_hook=_Pairs, parse_constant=_NotANumber)
    except (ValueError, RecursionError):
        return [Fault("", f"the body isn't JSON: {message}")]
    _collect(found, (), faults)
    return faults or [Fault("", f"the body isn't JSON that can be read here: {message}")]


class _Pairs(list[tuple[str, Any]]):
    """An object as its pairs, so that a key may be seen twice."""


class _NotANumber(str):
    """NaN or Infinity, which JSON doesn't have."""


def _collect(value: object, path: Path, faults: list[Fault]) -> None:
    if isinstance(value, _NotANumber):
        faults.append(Fault(pointer(path), f"{value} isn't a number that JSON knows"))
    elif isinstance(value, _Pairs):
        seen: set[str] = set()
        for key, item in value:
            if key in seen:
                faults.append(Fault(pointer((*path, key)), f"the key '{key[:64]}' stands twice"))
            seen.add(key)
            _collect(item, (*path, key), faults)
    elif isinstance(value, list):
        for index, item in enumerate(value):
            _collect(item, (*path, index), faults)


def read(model: type[M], raw: object) -> M:
    """A question from what was posted.

    `raw` belongs to the reader from here on: defaults are written into its `system`.

    Raises
    ------
    Invalid
        With every fault that was found.
    """
    system = raw.get("system") if isinstance(raw, dict) else None
    normalize_names(system)
    faults = list(system_faults(system))
    filled = fill_defaults(system) if isinstance(system, dict) else set()
    question: M = _validated(
        _validator(model),
        raw,
        Invalid(faults).under("/system").faults,
        {("system", *path) for path in filled},
    )
    return question


def read_system(raw: object) -> AnySystem:
    """A system from what was posted; pointers start at the system itself.

    Raises
    ------
    Invalid
        With every fault that was found.
    """
    normalize_names(raw)
    faults = list(system_faults(raw))
    filled = fill_defaults(raw) if isinstance(raw, dict) else set()
    system: AnySystem = _validated(_system_validator(), raw, faults, filled)
    return system


@cache
def _validator(model: type[BaseModel]) -> Callable[[object], Any]:
    return TypeAdapter(model).validator.validate_python


@cache
def _system_validator() -> Callable[[object], Any]:
    return TypeAdapter[AnySystem](System).validator.validate_python


def _validated(
    validate: Callable[[object], Any], raw: object, faults: list[Fault], filled: set[Path]
) -> Any:
    try:
        model = validate(raw)
    except ValidationError as error:
        found = [_fault(detail, raw, filled) for detail in error.errors(include_url=False)]
        raise Invalid(_in_one(faults, found)) from None
    if faults:
        raise Invalid(faults)
    return model


def _in_one(first: Iterable[Fault], second: Iterable[Fault | None]) -> list[Fault]:
    """Both lists, one fault for a place."""
    by_place: dict[str, Fault] = {}
    for fault in (*second, *first):
        if fault is not None:
            by_place.setdefault(fault.pointer, fault)
    return list(by_place.values())


def _fault(error: ErrorDetails, raw: object, filled: set[Path]) -> Fault | None:
    path = _path_in(raw, error)
    if any(path[: len(place)] == place for place in filled):
        return None  # the fault is reported where the default comes from
    return Fault(pointer(path), _DETAILS.get(error["type"], _as_said)(error))


def _path_in(raw: object, error: ErrorDetails) -> Path:
    """Pydantic's path without the names of union branches, which aren't in the document.

    Every object with a `kind` is a branch of a union: its kind comes first in the path, even
    where the object has a field of that name too.
    """
    path: list[str | int] = []
    node = raw
    last = len(error["loc"]) - 1
    branch_named = False
    for place, key in enumerate(error["loc"]):
        if isinstance(node, dict) and node.get("kind") == key and not branch_named:
            branch_named = True
            continue
        branch_named = False
        if isinstance(node, dict) and key in node:
            node = node[key]
        elif isinstance(node, list) and isinstance(key, int) and key < len(node):
            node = node[key]
        elif not (place == last and error["type"] == "missing"):
            continue
        path.append(key)
    if error["type"] in ("union_tag_invalid", "union_tag_not_found"):
        path.append(str(error.get("ctx", {}).get("discriminator", "kind")).strip("'"))
    return (*path, *error.get("ctx", {}).get("at", ()))


def _as_said(error: ErrorDetails) -> str:
    message = error["msg"]
    return message[:1].lower() + message[1:]


def _unknown_kind(error: ErrorDetails) -> str:
    context = error.get("ctx", {})
    return f"'{context.get('tag', '')}' isn't one of {context.get('expected_tags', '')}"


_DETAILS: dict[str, Callable[[ErrorDetails], str]] = {
    "missing": lambda _: "this field is needed",
    "extra_forbidden": lambda _: "unknown field",
    "union_tag_invalid": _unknown_kind,
    "union_tag_not_found": lambda _: "this field is needed",
    "model_type": lambda _: "expected an object",
    "model_attributes_type": lambda _: "expected an object",
    "dict_type": lambda _: "expected an object",
    "list_type": lambda _: "expected a list",
    "too_short": lambda error: f"expected at least {error['ctx']['min_length']} items",
    "too_long": lambda error: f"expected at most {error['ctx']['max_length']} items",
    "string_type": lambda _: "expected a string",
    "float_type": lambda _: "expected a number",
    "finite_number": lambda _: "must be a finite number",
    "int_type": lambda _: "expected a whole number",
    "bool_type": lambda _: "expected true or false",
}
