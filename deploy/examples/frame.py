"""A pipe-rack frame of 20 000 degrees of freedom, as matrices: prints a question for /v1/modes.

Springs tie equal masses on a grid of 20 × 25 × 40 nodes that stands on the ground; every node moves
in x alone. Run: python deploy/examples/frame.py > frame.json
"""

import json
from collections.abc import Iterator

BAYS = (20, 25, 40)
MASS, STIFFNESS = 85.0, 3.4e7  # kg, N/m


def entries() -> Iterator[tuple[int, int, float]]:
    """Entries of the upper triangle of the stiffness matrix."""
    across, along, high = BAYS
    for x in range(across):
        for y in range(along):
            for z in range(high):
                node = (x * along + y) * high + z
                for step, inside in (
                    (along * high, x + 1 < across),
                    (high, y + 1 < along),
                    (1, z + 1 < high),
                ):
                    if inside:
                        yield node, node + step, -STIFFNESS
                ties = (x > 0) + (x + 1 < across) + (y > 0) + (y + 1 < along) + 1 + (z + 1 < high)
                yield node, node, ties * STIFFNESS


def question() -> dict[str, object]:
    """The ten lowest modes, with the shape of one corner only."""
    across, along, high = BAYS
    size = across * along * high
    rows, columns, values = zip(*entries(), strict=True)
    numbers = list(range(size))
    system = {
        "kind": "matrices",
        "name": "pipe rack",
        "degrees_of_freedom": [f"n{number}/x" for number in numbers],
        "mass": {"rows": numbers, "columns": numbers, "values": [MASS] * size},
        "stiffness": {"rows": rows, "columns": columns, "values": values, "symmetric": True},
    }
    return {"system": system, "count": 10, "shapes_of": [f"n{size - 1}/x"]}


if __name__ == "__main__":
    print(json.dumps(question()))
