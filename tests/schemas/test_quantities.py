"""Numbers with units, names and paths."""

from math import pi
from typing import Any

import pytest
from pydantic import TypeAdapter, ValidationError

from schemas.quantities import (
    AnyStiffness,
    DegreeOfFreedom,
    Frequency,
    Inertia,
    Length,
    Mass,
    Motions,
    Name,
    PositiveLength,
    PositiveSpeed,
    Rate,
    Ratio,
    RotationalStiffness,
    Stiffness,
    split_degree_of_freedom,
)


def read(kind: Any, value: object) -> Any:
    return TypeAdapter(kind).validate_python(value)


def refusal(kind: Any, value: object) -> str:
    with pytest.raises(ValidationError) as caught:
        read(kind, value)
    return str(caught.value.errors()[0]["msg"])


# Exact by definition: NIST Special Publication 811, appendix B.
POUND, INCH, GRAVITY = 0.45359237, 0.0254, 9.80665
POUND_FORCE = POUND * GRAVITY


@pytest.mark.parametrize(
    ("kind", "text", "si"),
    [
        (Stiffness, "12 kN/mm", 12e6),
        (Stiffness, "12kN/mm", 12e6),
        (Stiffness, " 3.5e2  N/mm ", 3.5e5),
        (Stiffness, "40 lbf/in", 40 * POUND_FORCE / INCH),
        (Stiffness, "2 kip/in", 2000 * POUND_FORCE / INCH),
        (Stiffness, "5 kgf/mm", 5 * GRAVITY * 1000),
        (Stiffness, "-5 N/m", -5.0),
        (Mass, "40 lb", 40 * POUND),
        (Mass, "2 slug", 2 * POUND_FORCE / 0.3048),
        (Mass, "3 lbf*s^2/in", 3 * POUND_FORCE / INCH),
        (Mass, "3 lbf·s²/in", 3 * POUND_FORCE / INCH),
        (Mass, "1.5 t", 1500.0),
        (Mass, "250 g", 0.25),
        (Length, "3.5 in", 0.0889),
        (Length, "-2 ft", -0.6096),
        (Length, "10 µm", 1e-5),
        (Length, ".5 mm", 5e-4),
        (Inertia, "7 kg m^2", 7.0),
        (Inertia, "7 kg·m²", 7.0),
        (Inertia, "9 lb*in^2", 9 * POUND * INCH**2),
        (Inertia, "9 lbf in s^2", 9 * POUND_FORCE * INCH),
        (RotationalStiffness, "10 N·m/deg", 10 * 180 / pi),
        (RotationalStiffness, "10 N m/rad", 10.0),
        (RotationalStiffness, "10 lbf*in/rad", 10 * POUND_FORCE * INCH),
        (AnyStiffness, "10 kN·m/rad", 1e4),
        (AnyStiffness, "10 kN/m", 1e4),
        (Frequency, "15 Hz", 15.0),
        (Frequency, "1.5 kHz", 1500.0),
        (Frequency, "900 rpm", 15.0),
        (Frequency, "100 rad/s", 100 / (2 * pi)),
        (PositiveSpeed, "1487 rpm", 1487.0),
        (PositiveSpeed, "25 Hz", 1500.0),
        (PositiveSpeed, "100 rad/s", 3000 / pi),
        (PositiveSpeed, "2 turn/s", 120.0),
        (Ratio, "20 %", 0.2),
        (Rate, "0.5 s^-1", 0.5),
    ],
)
def test_a_string_with_a_unit_is_read_in_si(kind: Any, text: str, si: float) -> None:
    assert read(kind, text) == pytest.approx(si, rel=4e-15, abs=0)


@pytest.mark.parametrize("number", [3, 3.0, 2.5e-3, 0, 10**20])
def test_a_bare_number_is_si_already(number: float) -> None:
    assert read(Mass, number) == float(number)


def test_there_is_one_zero() -> None:
    assert str(read(Length, -0.0)) == "0.0"
    assert str(read(Length, "-0 mm")) == "0.0"


@pytest.mark.parametrize("value", [1e-35, -1e-300, 5e-324, "1e-40 m"])
def test_what_roundoff_leaves_of_a_coordinate_is_zero(value: object) -> None:
    assert read(Length, value) == 0.0


@pytest.mark.parametrize(
    ("kind", "text"),
    [
        (Mass, "3 m"),
        (Mass, "3 lbf"),
        (Stiffness, "12 kN"),
        (Stiffness, "12 N·m/rad"),
        (RotationalStiffness, "12 N/m"),
        (Inertia, "3 kg"),
        (Inertia, "3 lb in s^2"),
        (Length, "3 s"),
        (Length, "20 degC"),
        (Ratio, "3 dB"),
        (Frequency, "3 m"),
        (Frequency, "15 s^-1"),
        (PositiveSpeed, "1500 min^-1"),
        (PositiveSpeed, "1500 1/min"),
    ],
)
def test_a_unit_of_another_kind_is_refused(kind: Any, text: str) -> None:
    assert text.split(" ", 1)[1] in refusal(kind, text) or "number and its unit" in refusal(
        kind, text
    )


def test_a_mass_where_a_force_belongs_is_explained() -> None:
    assert "lbf" in refusal(Stiffness, "40 lb/in")
    assert "kgf" in refusal(Stiffness, "40 kg/mm")


@pytest.mark.parametrize(
    "unit", ["furlongx", "kN/mmm", "m)", "((m", "m/0", "%^0", "m^^2", "m^99", "m**9**9", "_"]
)
def test_an_unknown_unit_is_named(unit: str) -> None:
    assert refusal(Length, f"3 {unit}") == f"unknown unit '{unit}'"


@pytest.mark.parametrize(
    "text",
    [
        "",
        " ",
        "m",
        "12,5 mm",
        "1 000 mm",
        "--3 m",
        "nan m",
        "inf m",
        "1e m",
        "１２ mm",
        "0x10",
        "3 ,m",
    ],
)
def test_what_is_no_number_with_a_unit_is_refused(text: str) -> None:
    assert refusal(Length, text)


@pytest.mark.parametrize("text", ["12", "12.5", "1e3", " 12 "])
def test_a_bare_numeric_string_is_refused(text: str) -> None:
    assert "without quotes" in refusal(Length, text)


@pytest.mark.parametrize("value", [True, False, None, [], {}, [1.0], b"1 m", 1j])
def test_what_is_no_number_at_all_is_refused(value: object) -> None:
    assert refusal(Length, value) == "expected a number in m or a string with a unit"


@pytest.mark.parametrize("value", [float("nan"), float("inf"), float("-inf"), 10**400])
def test_nan_and_infinity_are_refused(value: float) -> None:
    assert refusal(Length, value) == "must be a finite number"


@pytest.mark.parametrize("value", [1e31, "1e40 m", 1e-40, "1e-35 kg"])
def test_a_size_beyond_all_machines_is_refused(value: object) -> None:
    assert refusal(Mass, value)


def test_signs_are_held_to_what_the_quantity_can_be() -> None:
    assert refusal(Mass, -1.0) == "must not be negative"
    assert refusal(Mass, "-1 lb") == "must not be negative"
    assert refusal(PositiveLength, 0.0) == "must be greater than zero"
    assert refusal(PositiveLength, "0 mm") == "must be greater than zero"


def test_a_unit_is_never_evaluated_as_an_expression() -> None:
    for text in ("1 __import__('os')", "1 m if 1 else m", "1 lambda: 0", "1 m" + "*m" * 200):
        assert refusal(Length, text)


@pytest.mark.parametrize(
    "name",
    [
        "a",
        "7",
        "fan 2.B_x-y",
        "Ventilator für Halle",
        "вентилятор",
        "送風機",
        "مروحة",
        "पंखा",
        "พัดลม",
        "1号ポンプ",
        "x" * 64,
    ],
)
def test_a_name_may_be_of_any_script(name: str) -> None:
    assert read(Name, name) == name


@pytest.mark.parametrize(
    "name",
    [
        "",
        " fan",
        "_fan",
        "-fan",
        ".fan",
        "fan/1",
        "fan\n",
        "fan\t1",
        "=cmd",
        "fan|1",
        "<b>",
        "fan,1",
        'fan"',
        "fan;",
        "\u0301a",
        "a\u200b",
        "a\u202eb",
        "x" * 65,
        "ground",
    ],
)
def test_a_name_of_other_characters_is_refused(name: str) -> None:
    assert refusal(Name, name)


def test_a_letter_and_its_accent_are_one_letter() -> None:
    assert read(Name, "cafe\u0301") == "café"
    assert read(DegreeOfFreedom, "cafe\u0301/x") == "café/x"


@pytest.mark.parametrize("path", ["skid/z", "north mount/rx", "送風機/ry"])
def test_a_degree_of_freedom_is_body_and_motion(path: str) -> None:
    body, _, motion = path.partition("/")
    assert split_degree_of_freedom(read(DegreeOfFreedom, path)) == (body, motion)


@pytest.mark.parametrize("path", ["skid", "skid/", "/z", "skid/w", "skid/z/z", "ground/z", "a b/Z"])
def test_what_is_no_degree_of_freedom_is_refused(path: str) -> None:
    assert "BODY/MOTION" in refusal(DegreeOfFreedom, path)


def test_motions_are_put_in_order_and_stand_once() -> None:
    assert read(Motions, ["rz", "x", "ry"]) == ["x", "ry", "rz"]
    assert refusal(Motions, ["x", "x"]) == "a motion stands here twice"
    assert refusal(Motions, ["w"])
