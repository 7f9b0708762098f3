"""Margins, coincidence and barred speeds from their definitions."""

from math import isclose

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.compute.separation import (
    Excitation,
    Required,
    barred,
    coincidence_rpm,
    free_ranges,
    margin,
)

RULE = Required(above=0.2, below=0.15)


@pytest.mark.parametrize(
    ("frequency", "expected", "required", "side"),
    [
        (12.0, 0.2, 0.2, "above"),
        (15.0, 0.5, 0.2, "above"),
        (4.0, 0.2, 0.15, "below"),
        (10.0, 0.0, 0.2, "inside"),
        (5.0, 0.0, 0.15, "inside"),
        (7.0, 0.0, 0.15, "inside"),
        (8.0, 0.0, 0.2, "inside"),
    ],
)
def test_the_margin_is_the_distance_to_the_nearer_edge_over_that_edge(
    frequency: float, expected: float, required: float, side: str
) -> None:
    # The band is 5 to 10 Hz; worked by hand from the definition in the contract.
    found = margin(frequency, 5.0, 10.0, RULE)
    assert isclose(found.margin, expected, abs_tol=1e-15)
    assert (found.required, found.side) == (required, side)


def test_a_margin_that_equals_what_is_required_is_kept_despite_roundoff() -> None:
    for edge in (0.1, 0.3, 0.7, 7.7, 13.1, 24.783333333333335):
        assert margin(edge * 1.2, edge / 2, edge, RULE).is_kept
        assert margin(edge * 0.85, edge, edge * 2, RULE).is_kept
        assert not margin(edge * 1.2 * (1 - 1e-9), edge / 2, edge, RULE).is_kept


def test_an_edge_is_met_despite_roundoff() -> None:
    assert margin(10.0 * (1 + 1e-15), 5.0, 10.0, RULE).side == "inside"
    assert margin(10.0 * (1 + 1e-9), 5.0, 10.0, RULE).side == "above"
    assert not margin(10.0, 5.0, 10.0, Required(0.0, 0.0)).is_kept


def test_an_order_meets_a_mode_at_sixty_f_over_the_order() -> None:
    assert coincidence_rpm(30.0, Excitation("2x", 2.0, None)) == 900.0
    assert coincidence_rpm(30.0, Excitation("line", None, 50.0)) is None
    assert Excitation("2x", 2.0, None).band(900.0, 1200.0) == (30.0, 40.0)
    assert Excitation("line", None, 50.0).band(900.0, 1200.0) == (50.0, 50.0)


def test_barred_speeds_end_where_the_margin_is_just_kept() -> None:
    low, high = barred(30.0, Excitation("1x", 1.0, None), RULE)
    assert low == pytest.approx(30.0 / 1.2 * 60)
    assert high == pytest.approx(30.0 / 0.85 * 60)


speeds = st.integers(0, 60)
ranges = st.lists(st.tuples(speeds, st.integers(1, 9)).map(lambda p: (p[0], p[0] + p[1])))


@given(speeds, st.integers(0, 40), ranges)
def test_free_ranges_are_what_open_ranges_leave(
    low: int, width: int, closed: list[tuple[int, int]]
) -> None:
    high = low + width
    barred_ranges = [(float(a), float(b)) for a, b in closed]
    free = free_ranges(float(low), float(high), barred_ranges)
    # Between integers, where no edge lies: every half is free or barred without doubt.
    for twice in range(2 * low + 1, 2 * high, 2):
        speed = twice / 2
        is_barred = any(a < speed < b for a, b in barred_ranges)
        assert any(a <= speed <= b for a, b in free) != is_barred
    assert all(low <= a <= b <= high for a, b in free)
    assert free == sorted(free)


def test_a_single_speed_is_free_or_not() -> None:
    assert free_ranges(5.0, 5.0, []) == [(5.0, 5.0)]
    assert free_ranges(5.0, 5.0, [(4.0, 6.0)]) == []
    assert free_ranges(5.0, 5.0, [(5.0, 6.0)]) == [(5.0, 5.0)]
    assert free_ranges(5.0, 5.0, [(4.0, 5.0)]) == [(5.0, 5.0)]
