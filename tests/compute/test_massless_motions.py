"""Motions without inertia: condensed out exactly, recovered in the shapes."""

from math import pi, sqrt

import pytest

from schemas.faults import Invalid
from tests.tasks.asking import bodies, hertz, matrices, modes, spring


@pytest.mark.parametrize("stiffnesses", [[3e4, 5e4], [1e2, 1e4], [7.0, 11.0, 13.0, 17.0]])
def test_springs_in_series_through_massless_points_add_their_flexibilities(
    stiffnesses: list[float],
) -> None:
    points = [{"name": f"point {i}"} for i in range(len(stiffnesses) - 1)]
    ends = ["ground", *(point["name"] for point in points), "mass"]
    chain = [
        spring(f"spring {i}", second, first, k)
        for i, (first, second, k) in enumerate(zip(ends, ends[1:], stiffnesses, strict=False))
    ]
    answer = modes(bodies({"name": "mass", "mass": 2.5}, *points, *chain, motions=["x"]))
    (mode,) = answer["modes"]
    series = 1 / sum(1 / k for k in stiffnesses)
    assert mode["frequency_hz"] == pytest.approx(sqrt(series / 2.5) / (2 * pi), rel=1e-12)
    # The force is the same all along: each point has moved by what is stretched below it.
    share = [series * sum(1 / k for k in stiffnesses[: i + 1]) for i in range(len(stiffnesses) - 1)]
    assert mode["shape"][1:] == pytest.approx([s * mode["shape"][0] for s in share], rel=1e-9)
    assert any("point 0/x" in warning for warning in answer["warnings"])


def test_a_point_between_a_soft_and_a_very_stiff_spring_is_within_its_bound() -> None:
    system = bodies(
        {"name": "mass", "mass": 2.5},
        {"name": "point"},
        spring("soft", "point", "ground", 1e2),
        spring("stiff", "mass", "point", 1e10),
        motions=["x"],
    )
    (mode,) = modes(system)["modes"]
    expected = sqrt(1 / (1 / 1e2 + 1 / 1e10) / 2.5) / (2 * pi)
    assert abs(mode["frequency_hz"] - expected) <= mode["frequency_bound_hz"] < 1e-6


def test_a_rotation_without_inertia_follows_the_others() -> None:
    # A bar without inertia in rotation, on two springs: at its mass the flexibilities of both ends
    # add up, each weighted with the square of its lever.
    k1, k2, a, b, m = 4e4, 9e4, 0.3, 0.5, 20.0
    system = bodies(
        {"name": "bar", "mass": m, "motions": ["z", "ry"]},
        spring("left", "bar", "ground", {"z": k1}, at=[-a, 0, 0]),
        spring("right", "bar", "ground", {"z": k2}, at=[b, 0, 0]),
    )
    flexibility = (b / (a + b)) ** 2 / k1 + (a / (a + b)) ** 2 / k2
    assert hertz(system) == [pytest.approx(sqrt(1 / (flexibility * m)) / (2 * pi), rel=1e-13)]


def test_a_singular_mass_matrix_is_condensed_along_its_null_direction() -> None:
    # M = [[1, 1], [1, 1]]: only the sum has inertia, and K = diag(k₁, k₂) acts as two in series.
    answer = modes(matrices([[1.0, 1.0], [1.0, 1.0]], [[30.0, 0.0], [0.0, 60.0]]))
    (mode,) = answer["modes"]
    assert mode["frequency_hz"] == pytest.approx(sqrt(30 * 60 / 90) / (2 * pi), rel=1e-13)
    first, second = mode["shape"]
    assert 30.0 * first == pytest.approx(60.0 * second)


def test_a_massless_motion_without_stiffness_is_named() -> None:
    loose = bodies({"name": "mass", "mass": 1.0}, {"name": "point"}, motions=["x"])
    with pytest.raises(Invalid) as caught:
        modes(loose)
    (fault,) = caught.value.faults
    assert fault.pointer == "/system/bodies/1"
    assert "point/x has neither inertia nor stiffness" in fault.detail


def test_a_massless_motion_of_matrices_without_stiffness_is_named() -> None:
    with pytest.raises(Invalid) as caught:
        modes(matrices([[1.0, 0.0], [0.0, 0.0]], [[5.0, 0.0], [0.0, 0.0]]))
    (fault,) = caught.value.faults
    assert fault.pointer == "/system/degrees_of_freedom/1"


def test_a_body_that_can_turn_but_has_no_inertia_is_named() -> None:
    system = bodies(
        {"name": "skid", "mass": 100.0},
        spring("mount", "skid", "ground", {"z": 1e5, "x": 1e5, "y": 1e5}),
    )
    with pytest.raises(Invalid) as caught:
        modes(system)
    (fault,) = caught.value.faults
    assert fault.pointer == "/system/bodies/0"
    assert "skid/r" in fault.detail


@pytest.mark.parametrize(
    ("mass", "place"),
    [
        ([[1.0, 0.0], [0.0, -1.0]], "/system/mass/1/1"),
        ([[1.0, 0.5], [0.5, 0.0]], "/system/mass/1/0"),
        ([[1.0, 2.0], [2.0, 1.0]], "/system/mass/"),
    ],
)
def test_a_mass_that_is_not_positive_semidefinite_is_refused_at_its_entry(
    mass: list[list[float]], place: str
) -> None:
    with pytest.raises(Invalid) as caught:
        modes(matrices(mass, [[5.0, 0.0], [0.0, 5.0]]))
    (fault,) = caught.value.faults
    assert fault.pointer.startswith(place)


@pytest.mark.parametrize("field", ["mass", "stiffness"])
def test_a_matrix_that_is_not_symmetric_is_refused_at_the_entry_that_is_off_most(
    field: str,
) -> None:
    raw = matrices([[4.0, 0.1], [0.1, 5.0]], [[5.0, -1.0], [-1.0, 6.0]])
    raw[field][0][1] += 0.01
    with pytest.raises(Invalid) as caught:
        modes(raw)
    (fault,) = caught.value.faults
    assert fault.pointer in (f"/system/{field}/0/1", f"/system/{field}/1/0")


def test_what_roundoff_leaves_of_a_zero_entry_is_no_asymmetry() -> None:
    raw = matrices([[4.0, 0.0], [0.0, 5.0]], [[5e6, 0.0], [1e-12, 6e6]])
    assert hertz(raw) == pytest.approx(sorted(sqrt(k) / (2 * pi) for k in (5e6 / 4, 6e6 / 5)))


@pytest.mark.parametrize(
    "system",
    [
        bodies({"name": "a", "mass": 1.0, "held": ["x"]}, motions=["x"]),
        bodies({"name": "a", "mass": 1.0}, motions=[]),
        bodies({"name": "a"}, spring("s", "a", "ground", 5.0), motions=["x"]),
    ],
    ids=["all held", "no motions", "no mass"],
)
def test_a_machine_in_which_nothing_can_vibrate_is_refused(system: dict[str, object]) -> None:
    with pytest.raises(Invalid) as caught:
        modes(system)
    assert [fault.pointer for fault in caught.value.faults] == ["/system/bodies"]
