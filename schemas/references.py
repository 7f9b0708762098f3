"""What no single field can show: names that must be unique or known, defaults that lie elsewhere.

These checks look at what was posted, before the models read it, so that one round finds the
faults of both kinds. They pass over whatever is of the wrong type: the models name that.
"""

from collections.abc import Callable, Iterator
from math import isfinite
from typing import Any
from unicodedata import normalize

from schemas.faults import Fault, pointer
from schemas.quantities import MOTIONS, measures, split_degree_of_freedom

Raw = dict[str, Any]
PLACED = ("spring", "damper", "bearing", "pad")  # kinds whose `at` is the first body's by default
ROTATIONS = frozenset(MOTIONS[3:])


def _items(value: object) -> list[tuple[int, Raw]]:
    if not isinstance(value, list):
        return []
    return [(index, item) for index, item in enumerate(value) if isinstance(item, dict)]


def _motions(value: object, default: list[str]) -> list[str]:
    if isinstance(value, list) and all(isinstance(motion, str) for motion in value):
        return value
    return default


def normalize_names(system: object) -> None:
    """Write every name of `system` in its composed form (Unicode NFC), so that equal names match.

    One letter may be posted as itself or as a letter and its accent.
    """
    if not isinstance(system, dict):
        return
    for field in ("bodies", "connections"):
        for _, item in _items(system.get(field)):
            for key in ("name", "body"):
                if key in item:
                    item[key] = _composed(item[key])
            if isinstance(item.get("between"), list):
                item["between"] = [_composed(end) for end in item["between"]]
    if isinstance(system.get("degrees_of_freedom"), list):
        names = system["degrees_of_freedom"]
        system["degrees_of_freedom"] = [_composed(name) for name in names]


def _composed(name: object) -> object:
    if not isinstance(name, str) or name.isascii():
        return name
    return normalize("NFC", name)


def fill_defaults(system: Raw) -> set[tuple[str | int, ...]]:
    """Write into `system` the defaults that depend on another field; returns where.

    A body's `motions` are the system's, a connection's `at` is the first body's.
    """
    filled: set[tuple[str | int, ...]] = set()
    if system.get("kind") != "bodies":
        return filled
    motions = _motions(system.get("motions"), list(MOTIONS))
    places: dict[object, Any] = {}
    for index, body in _items(system.get("bodies")):
        if "motions" not in body:
            body["motions"] = motions
            filled.add(("bodies", index, "motions"))
        if isinstance(body.get("name"), str):
            places.setdefault(body["name"], body.get("at", [0.0, 0.0, 0.0]))
    for index, connection in _items(system.get("connections")):
        if "at" in connection or connection.get("kind") not in PLACED:
            continue
        first = next((end for end in _ends(connection) if end in places), None)
        if first is not None:
            connection["at"] = places[first]
            filled.add(("connections", index, "at"))
    return filled


def _ends(connection: Raw) -> list[str]:
    between = connection.get("between")
    if isinstance(between, list):
        return [end for end in between if isinstance(end, str)]
    return [connection["body"]] if isinstance(connection.get("body"), str) else []


def system_faults(system: object) -> Iterator[Fault]:
    """Every fault of a posted system that lies between its fields; pointers start at the system."""
    if not isinstance(system, dict):
        return
    if system.get("kind") == "bodies":
        yield from _names(system)
        yield from _bodies(system)
        yield from _connections(system)
    elif system.get("kind") == "matrices":
        yield from _matrices(system)


def _names(system: Raw) -> Iterator[Fault]:
    seen: dict[str, str] = {}
    for field in ("bodies", "connections"):
        for index, item in _items(system.get(field)):
            name = item.get("name")
            if not isinstance(name, str):
                continue
            place = pointer((field, index, "name"))
            if name in seen:
                yield Fault(place, f"the name '{name}' stands already at {seen[name]}")
            seen.setdefault(name, place)
    yield from _inner_points(system, seen)


def _inner_points(system: Raw, seen: dict[str, str]) -> Iterator[Fault]:
    """A name like that of a beam's inner point, NAME.1, belongs to that point."""
    for index, part in _items(system.get("connections")):
        name, elements = part.get("name"), part.get("elements", 4)
        if part.get("kind") != "beam" or not isinstance(name, str) or not isinstance(elements, int):
            continue
        taken = [f"{name}.{number}" for number in range(1, min(elements, 500))]
        for point in taken:
            if point in seen:
                yield Fault(
                    seen[point],
                    f"'{point}' is the name of an inner point of the beam at "
                    f"{pointer(('connections', index))}",
                )
        if taken and len(taken[-1]) > 64:
            yield Fault(
                pointer(("connections", index, "name")),
                "too long: the names of the beam's inner points would pass 64 characters",
            )


def _bodies(system: Raw) -> Iterator[Fault]:
    default = _motions(system.get("motions"), list(MOTIONS))
    for index, body in _items(system.get("bodies")):
        motions = _motions(body.get("motions"), default)
        for place, motion in enumerate(_motions(body.get("held"), [])):
            if motion in MOTIONS and motion not in motions:
                yield Fault(
                    pointer(("bodies", index, "held", place)),
                    f"the body doesn't move in '{motion}', so it can't be held there",
                )
        rotations = [motion for motion in motions if motion in ROTATIONS]
        inertia = body.get("inertia")
        if inertia is not None and not isinstance(inertia, dict) and len(rotations) > 1:
            yield Fault(
                pointer(("bodies", index, "inertia")),
                f"one number says nothing about {len(rotations)} rotations: give the tensor, "
                'like {"xx": 1, "yy": 1, "zz": 1}',
            )


def _connections(system: Raw) -> Iterator[Fault]:
    default = _motions(system.get("motions"), list(MOTIONS))
    motions = {
        body["name"]: set(_motions(body.get("motions"), default))
        for _, body in _items(system.get("bodies"))
        if isinstance(body.get("name"), str)
    }
    for index, connection in _items(system.get("connections")):
        at = ("connections", index)
        yield from _known_ends(connection, at, motions)
        check = _CHECKS.get(str(connection.get("kind")))
        if check:
            yield from check(connection, at, motions)


At = tuple[str | int, ...]
MotionsOf = dict[str, set[str]]


def _known_ends(connection: Raw, at: At, motions: MotionsOf) -> Iterator[Fault]:
    if isinstance(connection.get("body"), str) and connection["body"] not in motions:
        yield Fault(pointer((*at, "body")), f"there is no body '{connection['body'][:64]}'")
    between = connection.get("between")
    if not isinstance(between, list):
        return
    for place, end in enumerate(between):
        if isinstance(end, str) and end != "ground" and end not in motions:
            yield Fault(pointer((*at, "between", place)), f"there is no body '{end[:64]}'")
    if len(between) == 2 and between[0] == between[1]:
        yield Fault(pointer((*at, "between")), "a connection needs two different ends")


def _shared(connection: Raw, motions: MotionsOf) -> set[str]:
    ends = [motions[end] for end in _ends(connection) if end in motions]
    return set.union(*ends) if ends else set()


def _spring(spring: Raw, at: At, motions: MotionsOf) -> Iterator[Fault]:
    yield from _direction(spring, at)
    yield from _single_number(spring, "stiffness", at, motions)
    yield from _single_number(spring, "damping", at, motions)
    stiffness = spring.get("stiffness")
    values = stiffness if isinstance(stiffness, dict) else {None: stiffness}
    if values and not any(_may_act(value) for value in values.values()):
        yield Fault(pointer((*at, "stiffness")), "a spring needs a stiffness that isn't zero")
    if isinstance(stiffness, dict) and not stiffness:
        yield Fault(pointer((*at, "stiffness")), "a spring needs a stiffness along some axis")
    if spring.get("destabilising") is True:
        return
    for axis, value in values.items():
        if _is_negative(value):
            yield Fault(
                pointer((*at, "stiffness") if axis is None else (*at, "stiffness", axis)),
                'must not be negative, unless the spring says "destabilising": true',
            )


def _is_negative(value: object) -> bool:
    if isinstance(value, str):
        return value.lstrip().startswith("-")
    return isinstance(value, int | float) and not isinstance(value, bool) and value < 0


def _may_act(value: object) -> bool:
    """False only for what is surely zero: other types are named by the models."""
    if isinstance(value, str):
        return bool(value.strip(" +-0.").strip()) and not value.lstrip(" +-0.").startswith(
            tuple("abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ")
        )
    return value != 0 or isinstance(value, bool)


def _damper(damper: Raw, at: At, motions: MotionsOf) -> Iterator[Fault]:
    yield from _direction(damper, at)
    yield from _single_number(damper, "damping", at, motions)
    damping = damper.get("damping")
    values = list(damping.values()) if isinstance(damping, dict) else [damping]
    if not any(_may_act(value) for value in values):
        yield Fault(pointer((*at, "damping")), "a damper needs a damping that isn't zero")


def _single_number(part: Raw, field: str, at: At, motions: MotionsOf) -> Iterator[Fault]:
    """A single number acts along `along`, or along the only motion that the bodies have."""
    value = part.get(field)
    if value is None or isinstance(value, dict) or not _ends(part):
        return
    shared = _shared(part, motions)
    if "along" not in part and len(shared) > 1:
        yield Fault(
            pointer((*at, field)),
            f"one number doesn't say in which of {len(shared)} motions it acts: give `along`, or "
            'one value per axis, like {"z": …}',
        )
        return
    dimension = field
    if "along" not in part and shared and shared <= ROTATIONS:
        dimension = f"rotational {field}"
    other = field if dimension != field else f"rotational {field}"
    if isinstance(value, str) and measures(value, other) and not measures(value, dimension):
        yield Fault(pointer((*at, field)), f"'{value}' isn't a unit of {dimension}")


def _direction(part: Raw, at: At) -> Iterator[Fault]:
    along, axes = part.get("along"), part.get("axes")
    if isinstance(along, list) and along and all(value == 0 for value in along):
        yield Fault(pointer((*at, "along")), "a direction can't be zero")
    if along is not None and axes is not None:
        yield Fault(pointer((*at, "along")), "give `along` or `axes`, not both")
    per_axis = [f for f in ("stiffness", "damping") if isinstance(part.get(f), dict)]
    if along is not None and per_axis:
        yield Fault(
            pointer((*at, "along")),
            f"`along` goes with a single number, not with {per_axis[0]} per axis",
        )
    if axes is not None and not _is_rotation(axes):
        yield Fault(
            pointer((*at, "axes")),
            "must be a rotation: 3×3, columns of length 1 at right angles, right-handed",
        )


def _is_rotation(axes: object) -> bool:
    """Within 1e-3, as from a drawing; the assembly uses the nearest exact rotation."""
    if not isinstance(axes, list) or len(axes) != 3:
        return True
    rows = [row for row in axes if isinstance(row, list) and len(row) == 3]
    flat = [value for row in rows for value in row]
    if len(flat) != 9 or not all(
        isinstance(v, int | float) and not isinstance(v, bool) and abs(v) <= 2 and isfinite(v)
        for v in flat
    ):
        return len(flat) != 9 or not all(type(v) in (int, float) for v in flat)
    x, y, z = zip(*rows, strict=True)
    dots = [
        (sum(a * b for a, b in zip(p, q, strict=True)) - (p is q))
        for p, q in ((x, x), (y, y), (z, z), (x, y), (y, z), (x, z))
    ]
    turn = (
        x[0] * (y[1] * z[2] - y[2] * z[1])
        - y[0] * (x[1] * z[2] - x[2] * z[1])
        + z[0] * (x[1] * y[2] - x[2] * y[1])
    )
    return all(abs(dot) < 1e-3 for dot in dots) and turn > 0


def _pendulum(pendulum: Raw, at: At, motions: MotionsOf) -> Iterator[Fault]:
    body = pendulum.get("body")
    if isinstance(body, str) and body in motions and not motions[body] & {"x", "y"}:
        yield Fault(pointer((*at, "body")), f"'{body}' has no horizontal translation to swing in")


def _link(link: Raw, at: At, motions: MotionsOf) -> Iterator[Fault]:
    ends = [motions[end] for end in _ends(link) if end in motions]
    if not ends:
        return
    shared = set.intersection(*ends)
    if not shared:
        yield Fault(pointer((*at, "between")), "the two have no motion in common to tie")
    for place, motion in enumerate(_motions(link.get("motions"), [])):
        if motion in MOTIONS and motion not in shared:
            yield Fault(
                pointer((*at, "motions", place)), f"the two don't share the motion '{motion}'"
            )


def _shaft(shaft: Raw, at: At, motions: MotionsOf) -> Iterator[Fault]:
    shared = _shared_rotations(shaft, motions)
    if shared is None:
        return
    if not shared:
        yield Fault(pointer((*at, "between")), "the two have no rotation in common to twist")
    elif "axis" in shaft:
        if shaft["axis"] in ROTATIONS and shaft["axis"] not in shared:
            yield Fault(pointer((*at, "axis")), f"the ends don't turn in '{shaft['axis']}'")
    elif len(shared) > 1 and "ground" in _ends(shaft):
        yield Fault(
            pointer((*at, "between")), "the body has several rotations: say which with `axis`"
        )


def _shared_rotations(part: Raw, motions: MotionsOf) -> set[str] | None:
    ends = [motions[end] & ROTATIONS for end in _ends(part) if end in motions]
    return set.intersection(*ends) if ends else None


def _gear(gear: Raw, at: At, motions: MotionsOf) -> Iterator[Fault]:
    for place, end in enumerate(_ends(gear)):
        if end == "ground":
            yield Fault(pointer((*at, "between", place)), "a gear runs between two bodies")
        rotations = motions.get(end, set()) & ROTATIONS
        if end in motions and "axis" in gear:
            if gear["axis"] in ROTATIONS and gear["axis"] not in rotations:
                yield Fault(pointer((*at, "axis")), f"'{end}' doesn't turn in '{gear['axis']}'")
        elif end in motions and len(rotations) != 1:
            yield Fault(
                pointer((*at, "between", place)),
                f"'{end}' has {len(rotations)} rotations: say with `axis` which one meshes",
            )


def _beam(beam: Raw, at: At, _: MotionsOf) -> Iterator[Fault]:
    for place, end in enumerate(_ends(beam)):
        if end == "ground":
            yield Fault(
                pointer((*at, "between", place)),
                "a beam needs a body at either end: hold a massless body there instead of ground",
            )
    up = beam.get("up")
    if isinstance(up, list) and up and all(value == 0 for value in up):
        yield Fault(pointer((*at, "up")), "a direction can't be zero")


def _bearing(bearing: Raw, at: At, motions: MotionsOf) -> Iterator[Fault]:
    axis = bearing.get("axis", "x")
    lateral = {"x", "y", "z"} - {axis} if isinstance(axis, str) else set()
    ends = [motions[end] for end in _ends(bearing) if end in motions]
    if ends and not set.union(*ends) & lateral:
        yield Fault(
            pointer((*at, "between")), f"nothing moves across the axis {axis} of this bearing"
        )


_CHECKS: dict[str, Callable[[Raw, At, MotionsOf], Iterator[Fault]]] = {
    "spring": _spring,
    "damper": _damper,
    "pendulum": _pendulum,
    "link": _link,
    "shaft": _shaft,
    "gear": _gear,
    "beam": _beam,
    "bearing": _bearing,
}


def _matrices(system: Raw) -> Iterator[Fault]:
    names = system.get("degrees_of_freedom")
    if not isinstance(names, list):
        return
    first: dict[str, int] = {}
    for index, name in enumerate(names):
        if isinstance(name, str) and split_degree_of_freedom(name):
            if name in first:
                yield Fault(
                    pointer(("degrees_of_freedom", index)),
                    f"'{name}' stands already at /degrees_of_freedom/{first[name]}",
                )
            first.setdefault(name, index)
    for field in ("mass", "stiffness", "damping", "gyroscopic", "structural"):
        yield from _square(system.get(field), field, len(names))


def _square(matrix: object, field: str, size: int) -> Iterator[Fault]:
    if not isinstance(matrix, list):
        return
    if len(matrix) != size:
        yield Fault(pointer((field,)), f"{len(matrix)} rows for {size} degrees of freedom")
    for index, row in enumerate(matrix):
        if isinstance(row, list) and len(row) != size:
            yield Fault(
                pointer((field, index)), f"{len(row)} columns for {size} degrees of freedom"
            )
