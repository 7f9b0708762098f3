"""Matrices as rows, as entries and as Matrix Market text."""

from typing import Any

import numpy as np
import pytest

from schemas.faults import Invalid
from tests.tasks.asking import hertz

Raw = dict[str, Any]
K = np.array([[300.0, -100.0, 0.0], [-100.0, 250.0, -50.0], [0.0, -50.0, 90.0]])
HEAD = "%%MatrixMarket matrix coordinate real symmetric\n3 3 5\n"
TEXT = HEAD + "1 1 300\n2 1 -100\n2 2 250\n3 2 -50\n3 3 90\n"


def system(stiffness: Any) -> Raw:
    """Three masses with this stiffness."""
    return {
        "kind": "matrices",
        "degrees_of_freedom": ["a/x", "b/x", "c/x"],
        "mass": {"rows": [0, 1, 2], "columns": [0, 1, 2], "values": [1.0, 2.0, 3.0]},
        "stiffness": stiffness,
    }


def entries(**changed: object) -> Raw:
    """The upper triangle as entries."""
    found = {
        "rows": [0, 0, 1, 1, 2], "columns": [0, 1, 1, 2, 2],
        "values": [300.0, -100.0, 250.0, -50.0, 90.0], "symmetric": True,
    }  # fmt: skip
    return {**found, **changed}


def test_every_way_of_writing_a_matrix_gives_the_same_hertz() -> None:
    root = np.sqrt([1.0, 2.0, 3.0])
    expected = np.sqrt(np.linalg.eigvalsh(K / root[:, None] / root)) / (2 * np.pi)
    full = "%%MatrixMarket matrix array real general\n3 3\n" + "\n".join(
        str(value) for value in K.T.ravel()
    )
    for stiffness in (
        K.tolist(), entries(), {"matrix_market": TEXT}, {"matrix_market": full},
        entries(rows=[0, 1, 1, 2, 2], columns=[0, 0, 1, 1, 2]),
    ):  # fmt: skip
        assert hertz(system(stiffness)) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize(
    ("stiffness", "pointer", "words"),
    [
        (entries(rows=[0, 0, 1, 1, 7]), "/system/stiffness/rows/4", "outside"),
        (entries(values=[1.0]), "/system/stiffness/rows", "5 entries, but 1 values"),
        (entries(rows=[0, 1, 1, 1, 2], columns=[0, 0, 1, 2, 2]), "/system/stiffness/rows/1",
         "triangle"),
        (entries(symmetric=False), "/system/stiffness", "not symmetric"),
        ([[1, 2, 0], [3, 1, 0], [0, 0, 1]], "/system/stiffness/1/0", "not symmetric"),
        ({"matrix_market": TEXT.replace("3 3 90", "3 4 90")}, "/system/stiffness/matrix_market",
         "Line 7"),
        ({"matrix_market": TEXT.replace("-50", "x")}, "/system/stiffness/matrix_market", "Line 6"),
        ({"matrix_market": TEXT.replace("-50", "1e99")}, "/system/stiffness/matrix_market",
         "Line 6"),
        ({"matrix_market": HEAD + "1 1 300\n"}, "/system/stiffness/matrix_market", "5 entries"),
        ({"matrix_market": TEXT.replace("real", "complex")}, "/system/stiffness/matrix_market",
         "Line 1"),
        ({"matrix_market": TEXT.replace("real", "pattern")}, "/system/stiffness/matrix_market",
         "Line 1"),
        ({"matrix_market": TEXT.replace("3 3 5", "4 4 5")}, "/system/stiffness/matrix_market",
         "3 degrees"),
        ({"matrix_market": TEXT.replace("3 3 5", "3 3 99999999999")},
         "/system/stiffness/matrix_market", "announced"),
        ({"matrix_market": "hello"}, "/system/stiffness/matrix_market", "Line 1"),
    ],
)  # fmt: skip
def test_a_malformed_matrix_is_named_at_its_entry_or_line(
    stiffness: Any, pointer: str, words: str
) -> None:
    with pytest.raises(Invalid) as caught:
        hertz(system(stiffness))
    found = {fault.pointer: fault.detail for fault in caught.value.faults}
    assert pointer in found, found
    assert words in found[pointer]


def test_a_beam_with_too_few_elements_for_its_highest_mode_is_warned_of() -> None:
    from tests.published.test_parts import beam
    from tests.tasks.asking import modes

    coarse = modes(beam((["z"], ["z"]), 4), count=4)["warnings"]
    fine = modes(beam((["z"], ["z"]), 16), count=4)["warnings"]
    assert any("elements" in warning for warning in coarse)
    assert not any("elements" in warning for warning in fine)


def test_a_large_system_that_cannot_be_solved_is_named_as_a_fault() -> None:
    from tests.tasks.asking import modes

    size, bare = 4100, 7
    numbers = list(range(size))
    values = [0.0 if number == bare else 1.0 for number in numbers]
    diagonal = {"rows": numbers, "columns": numbers, "values": values}
    large = {
        "kind": "matrices",
        "degrees_of_freedom": [f"n{number}/x" for number in numbers],
        "mass": diagonal,
        "stiffness": diagonal,
    }
    with pytest.raises(Invalid) as caught:
        modes(large, count=3)
    assert caught.value.faults[0].pointer == f"/system/degrees_of_freedom/{bare}"
    whole = {**large, "mass": {**diagonal, "values": [1.0] * size}}
    whole["stiffness"] = {**diagonal, "values": [1.0 + number for number in numbers]}
    with pytest.raises(Invalid) as caught:
        modes(whole, below_hz=100.0)
    assert "2000" in caught.value.faults[0].detail
