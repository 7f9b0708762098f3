"""500 random systems: no mode missed, and every frequency within its own bound.

How the reference is made and what it is good for is said in `exact_reference.py`. Free machines,
massless points, repeated roots, rigid ties and stiffnesses spread over eight decades are all among
the systems (`random_machines.py`).
"""

from functools import cache
from itertools import pairwise
from random import Random
from typing import Any

import pytest

from tests.properties.exact_reference import Reference, reference
from tests.properties.random_machines import FAMILIES
from tests.tasks.asking import modes

SEEDS = range(100)


@cache
def drawn(family: str, seed: int) -> tuple[dict[str, Any], Reference]:
    """A random system and what is known of it."""
    system = FAMILIES[family](Random(f"{family} {seed}"))
    return system, reference(system)


def wanted(seed: int, size: int) -> dict[str, Any]:
    """All modes of most systems, a few of the lowest of the others."""
    return {"count": size if seed % 4 else Random(seed).randint(1, size)}


def faults(answer: dict[str, Any], exact: Reference, count: int) -> list[str]:
    """Where an answer disagrees with the reference."""
    found = [
        f"mode {mode['number']} isn't within its bound"
        for place, mode in enumerate(answer["modes"])
        if not exact.holds(place, mode["kind"], mode["frequency_hz"], mode["frequency_bound_hz"])
    ]
    found += [
        f"the bound of mode {mode['number']} says little"
        for mode in answer["modes"]
        if not exact.is_sharp(mode["frequency_hz"], mode["frequency_bound_hz"])
    ]
    if len(answer["modes"]) != min(count, len(exact.values)):
        found.append(f"{len(answer['modes'])} modes of {len(exact.values)}")
    if not answer["evidence"]["complete"]:
        found.append("the count disagrees with the modes")
    if answer["evidence"]["sturm_count"] < len(answer["modes"]):
        found.append("the count misses modes")
    still = [mode for mode in answer["modes"] if mode["kind"] == "rigid-body"]
    if len(still) > exact.rigid or (len(still) < exact.rigid and count == len(exact.values)):
        found.append(f"{len(still)} rigid-body motions of {exact.rigid}")
    return found


@pytest.mark.parametrize("family", FAMILIES)
def test_no_mode_of_a_hundred_systems_is_missed_and_each_is_within_its_bound(family: str) -> None:
    wrong: dict[int, list[str]] = {}
    for seed in SEEDS:
        system, exact = drawn(family, seed)
        options = wanted(seed, len(exact.values))
        found = faults(modes(system, **options), exact, options["count"])
        if found:
            wrong[seed] = found
    assert not wrong


def test_the_systems_are_what_they_are_meant_to_be() -> None:
    exact = [drawn(family, seed)[1] for family in FAMILIES for seed in SEEDS[::5]]
    assert min(len(one.values) for one in exact) <= 2
    assert max(len(one.values) for one in exact) >= 50
    assert sum(one.rigid > 0 for one in exact) >= 15
    assert sum(bool(one.values[0] < -one.radius) for one in exact) >= 3
    repeated = [any(b - a <= 2 * one.radius for a, b in pairwise(one.values)) for one in exact]
    assert sum(repeated) >= 15
