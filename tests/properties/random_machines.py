"""Random machines of 2 to 60 degrees of freedom, each the same for its seed on every machine."""

import math
from collections.abc import Callable, Mapping
from random import Random
from typing import Any

Raw = dict[str, Any]
AXES = ["x", "y", "z", "rx", "ry", "rz"]


def _stiffness(draw: Random) -> float:
    """Spread evenly over eight decades."""
    return round(draw.uniform(1.0, 10.0), 3) * math.pow(10.0, draw.randint(1, 8))


def _mass(draw: Random) -> float:
    return round(math.pow(10.0, draw.uniform(-1.0, 3.0)), 4)


def _point(draw: Random) -> list[float]:
    return [round(draw.uniform(-2.0, 2.0), 3) for _ in range(3)]


def _pairs(draw: Random, size: int, more: float) -> list[tuple[int, int]]:
    """Edges of a connected graph: a random tree, and some more."""
    tree = [(place, draw.randrange(place)) for place in range(1, size)]
    return tree + [
        (first, second)
        for first in range(size)
        for second in range(first)
        if draw.random() < more / size
    ]


def line(draw: Random) -> Raw:
    """Masses on one axis, some of them massless points, free, grounded or hung."""
    size = draw.randint(2, 60)
    axis = draw.choice(AXES)
    inert = "mass" if len(axis) == 1 else "inertia"
    bodies: list[Raw] = [{"name": f"b{i}", inert: _mass(draw)} for i in range(size)]
    for body in bodies[1:]:
        if draw.random() < 0.2:
            del body[inert]
    parts = [
        _spring(number, f"b{first}", f"b{second}", _stiffness(draw))
        for number, (first, second) in enumerate(_pairs(draw, size, draw.choice([0.0, 1.0, 4.0])))
    ]
    for body in bodies if draw.random() < 0.6 else []:
        if draw.random() < 0.3:
            parts.append(_spring(len(parts), body["name"], "ground", _stiffness(draw)))
        elif axis in ("x", "y") and draw.random() < 0.3 and "mass" in body:
            length = round(draw.uniform(0.1, 5.0), 3)
            name = f"c{len(parts)}"
            parts.append({"kind": "pendulum", "name": name, "body": body["name"], "length": length})
    return {"kind": "bodies", "motions": [axis], "bodies": bodies, "connections": parts}


def _spring(number: int, first: str, second: str, stiffness: object, **fields: object) -> Raw:
    return {
        "kind": "spring",
        "name": f"c{number}",
        "between": [first, second],
        "stiffness": stiffness,
        **fields,
    }


def copies(draw: Random) -> Raw:
    """The same machine two to four times over, side by side or around one hub: repeated roots."""
    times = draw.randint(2, 4)
    size = draw.randint(1, 60 // times - 1)
    hub = draw.random() < 0.5
    masses = [_mass(draw) for _ in range(size)]
    edges = [(*pair, _stiffness(draw)) for pair in _pairs(draw, size, 1.0)]
    to_hub, to_ground = _stiffness(draw), _stiffness(draw) if draw.random() < 0.5 else None
    bodies = [{"name": "hub", "mass": _mass(draw)}] if hub or not to_ground else []
    parts: list[Raw] = []
    for copy in range(times):
        bodies += [{"name": f"{copy}.{i}", "mass": mass} for i, mass in enumerate(masses)]
        for first, second, stiffness in edges:
            parts.append(_spring(len(parts), f"{copy}.{first}", f"{copy}.{second}", stiffness))
        if hub:
            parts.append(_spring(len(parts), f"{copy}.0", "hub", to_hub))
        if to_ground:
            parts.append(_spring(len(parts), f"{copy}.{size - 1}", "ground", to_ground))
    return {"kind": "bodies", "motions": ["x"], "bodies": bodies, "connections": parts}


def plane(draw: Random) -> Raw:
    """Bodies and massless points in the plane x, z, ry with rigid arms, some tied, some held."""
    size = draw.randint(1, 20)
    motions = ["x", "z", "ry"]
    bodies: list[Raw] = []
    for place in range(size):
        body: Raw = {"name": f"b{place}", "at": _point(draw)}
        if place and draw.random() < 0.2:
            body["motions"] = ["x", "z"]
        else:
            body |= {"mass": _mass(draw), "inertia": _mass(draw)}
        if draw.random() < 0.1 and place:
            body["held"] = [draw.choice(["x", "z"])]
        bodies.append(body)
    parts = _mounts(draw, bodies, ["x", "z"], [("ry", 0.4)])
    for first, second in _pairs(draw, size, 0.0):
        if draw.random() < 0.1 and {"motions", "held"}.isdisjoint(
            {*bodies[first], *bodies[second]}
        ):
            ends = [f"b{first}", f"b{second}"]
            tied = draw.choice([["x", "z"], ["x", "z", "ry"]])
            name = f"c{len(parts)}"
            parts.append(
                {"kind": "link", "name": name, "between": ends, "at": _point(draw), "motions": tied}
            )
    return {"kind": "bodies", "motions": motions, "bodies": bodies, "connections": parts}


def _mounts(
    draw: Random, bodies: list[Raw], moves: list[str], turns: list[tuple[str, float]]
) -> list[Raw]:
    """A spring per axis along the edges of a connected graph, and some to ground."""
    edges = [(f"b{a}", f"b{b}") for a, b in _pairs(draw, len(bodies), 1.0)]
    if draw.random() < 0.7:
        edges += [(body["name"], "ground") for body in bodies if draw.random() < 0.4]
    parts = []
    for number, (first, second) in enumerate(edges):
        axes = [*moves, *(axis for axis, chance in turns if draw.random() < chance)]
        stiffness = {axis: _stiffness(draw) for axis in axes}
        at = next(b for b in bodies if b["name"] == first)["at"]
        at = at if draw.random() < 0.4 else _point(draw)
        parts.append(_spring(number, first, second, stiffness, at=at))
    return parts


def space(draw: Random) -> Raw:
    """Rigid bodies with full inertia tensors in six motions, on per-axis and inclined springs."""
    size = draw.randint(1, 10)
    bodies: list[Raw] = [
        {"name": f"b{i}", "at": _point(draw), "mass": _mass(draw), "inertia": _tensor(draw)}
        for i in range(size)
    ]
    turns = [("rx", 0.3), ("ry", 0.3), ("rz", 0.3)]
    parts = _mounts(draw, bodies, ["x", "y", "z"], turns)
    for body in bodies:
        for _ in range(draw.randint(0, 3)):
            stiffness, at = _stiffness(draw), _point(draw)
            along = [round(draw.uniform(0.1, 1.0), 2) for _ in range(3)]
            end = draw.choice([b["name"] for b in bodies if b is not body] or ["ground"])
            number = len(parts)
            parts.append(_spring(number, body["name"], end, stiffness, at=at, along=along))
    return {"kind": "bodies", "motions": AXES, "bodies": bodies, "connections": parts}


def _tensor(draw: Random) -> Raw:
    """That of a few point masses, so that it is one a body can have."""
    places = [_point(draw) for _ in range(4)]
    tensor = {
        "xx": sum(y * y + z * z for _, y, z in places),
        "yy": sum(x * x + z * z for x, _, z in places),
        "zz": sum(x * x + y * y for x, y, _ in places),
        "xy": -sum(x * y for x, y, _ in places),
        "yz": -sum(y * z for _, y, z in places),
        "xz": -sum(x * z for x, _, z in places),
    }
    return {axis: round(value, 3) for axis, value in tensor.items()}


def explicit(draw: Random) -> Raw:
    """Full matrices of integers: M = BᵀB + 1, and K definite, singular or indefinite."""
    size = draw.randint(2, 40)
    rank = draw.choice([size, size, size - 1, max(1, size // 2)])
    B = [[draw.randint(-3, 3) for _ in range(size)] for _ in range(size)]
    C = [[draw.randint(-9, 9) * 10 ** draw.randint(0, 3) for _ in range(size)] for _ in range(rank)]
    signs = [1 if draw.random() < 0.98 else -1 for _ in range(rank)]
    mass = [
        [float(sum(row[i] * row[j] for row in B) + (i == j)) for j in range(size)]
        for i in range(size)
    ]
    stiffness = [
        [
            float(sum(s * row[i] * row[j] for s, row in zip(signs, C, strict=True)))
            for j in range(size)
        ]
        for i in range(size)
    ]
    names = [f"b{i}/x" for i in range(size)]
    return {"kind": "matrices", "degrees_of_freedom": names, "mass": mass, "stiffness": stiffness}


FAMILIES: Mapping[str, Callable[[Random], Raw]] = {
    "on one axis": line,
    "of equal copies": copies,
    "in a plane": plane,
    "in space": space,
    "as matrices": explicit,
}
