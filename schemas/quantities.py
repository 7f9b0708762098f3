"""Physical numbers, names and paths.

A JSON number is SI. A string carries its unit, and `pint` knows what the unit is worth. The
number is split off by our own pattern so that no expression of a caller's is ever evaluated.
"""

import math
import re
import unicodedata
from dataclasses import dataclass
from functools import cache, lru_cache
from tokenize import TokenError
from typing import Annotated, Any, Literal

from pydantic import AfterValidator, Field, GetCoreSchemaHandler, GetJsonSchemaHandler
from pydantic_core import CoreSchema, core_schema

from schemas.base import fault

STANDARD_GRAVITY = 9.80665  # m/s², exact by definition (CGPM 1901)

# Beyond these a product of a few quantities could leave the range of a double.
SMALLEST, LARGEST = 1e-30, 1e30

Motion = Literal["x", "y", "z", "rx", "ry", "rz"]
MOTIONS: tuple[Motion, ...] = ("x", "y", "z", "rx", "ry", "rz")

SI_UNITS = {
    "mass": "kg",
    "length": "m",
    "inertia": "kg*m**2",
    "stiffness": "N/m",
    "rotational stiffness": "N*m/rad",
    "damping": "N*s/m",
    "rotational damping": "N*m*s/rad",
    "acceleration": "m/s**2",
    "time": "s",
    "rate": "1/s",
    "frequency": "turn/s",
    "speed": "turn/min",
    "ratio": "",
    "pressure": "Pa",
    "density": "kg/m**3",
    "area": "m**2",
    "second moment of area": "m**4",
    "force": "N",
    "moment": "N*m",
    "angle": "rad",
    "velocity": "m/s",
    "angular velocity": "rad/s",
    "angular acceleration": "rad/s**2",
    "mass eccentricity": "kg*m",
}
SHOWN_UNITS = {
    "mass": "kg",
    "length": "m",
    "inertia": "kg·m²",
    "stiffness": "N/m",
    "rotational stiffness": "N·m/rad",
    "damping": "N·s/m",
    "rotational damping": "N·m·s/rad",
    "acceleration": "m/s²",
    "time": "s",
    "rate": "1/s",
    "frequency": "Hz",
    "speed": "rpm",
    "ratio": "no unit",
    "pressure": "Pa",
    "density": "kg/m³",
    "area": "m²",
    "second moment of area": "m⁴",
    "force": "N",
    "moment": "N·m",
    "angle": "rad",
    "velocity": "m/s",
    "angular velocity": "rad/s",
    "angular acceleration": "rad/s²",
    "mass eccentricity": "kg·m",
}

_NUMBER_AND_UNIT = re.compile(
    r"\s*([+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d{1,3})?)\s*([^\d\s.+\-,].*?)?\s*", re.ASCII
)
_UNIT_CHARACTERS = re.compile(r"[A-Za-zµμΩ°%\"'*/^().\- 0-9]{1,48}")
_WRITTEN_OTHERWISE = str.maketrans({"·": "*", "×": "*", "⋅": "*", "²": "^2", "³": "^3", "⁴": "^4"})
# A bare 1/min isn't among them: to some it is a turn, to `pint` a radian.
_ANGLES = ("radian", "turn", "degree", "revolutions_per_minute", "revolutions_per_second")
# What `pint` and the tokenizer beneath it raise on text that is no unit.
_UNPARSED = (
    ArithmeticError,
    AssertionError,
    AttributeError,
    LookupError,
    TokenError,
    TypeError,
    ValueError,
)
_LARGE_EXPONENT = re.compile(r"\d\d|\*\*|\^.*\^|\^\s*-?\s*[5-9]")


@cache
def _registry() -> Any:
    import pint  # slow to import, and most callers post plain numbers

    return pint.UnitRegistry(cache_folder=None)


@lru_cache(maxsize=4096)
def unit_factor(unit: str, dimension: str) -> float:
    """What one `unit` is worth in the SI unit of `dimension`.

    Raises
    ------
    ValueError
        The unit is unknown or measures something else; the message says which.
    """
    import pint

    text = unit.translate(_WRITTEN_OTHERWISE)
    if not _UNIT_CHARACTERS.fullmatch(text) or _LARGE_EXPONENT.search(text):
        raise ValueError(f"unknown unit '{unit[:48]}'")
    try:
        given = _registry().Quantity(1.0, _registry().parse_units(text))
        _ = 2.0 * given  # refused by decibels and degrees Celsius, which no factor converts
    except (pint.errors.PintError, *_UNPARSED):
        raise ValueError(f"unknown unit '{unit}'") from None
    if dimension in ("frequency", "speed"):
        return _turns(given, unit, dimension)
    try:
        return float(given.to(SI_UNITS[dimension] or "dimensionless").magnitude)
    except pint.errors.PintError:
        raise ValueError(_wrong_dimension(text, unit, dimension)) from None


def _turns(given: Any, unit: str, dimension: str) -> float:
    """Frequencies apart: `pint` takes 1 Hz for 1 rad/s, a mechanic for one turn a second."""
    import pint

    per_second = 60.0 if dimension == "speed" else 1.0
    names = [str(name) for name, _ in given.unit_items()]
    try:
        if any(name.endswith("hertz") for name in names):
            return float(given.to("hertz").magnitude) * per_second
        if any(name.endswith(_ANGLES) for name in names):
            return float(given.to("turn/s").magnitude) * per_second
    except pint.errors.PintError:
        pass
    raise ValueError(f"'{unit}' isn't a frequency or a speed: use Hz, rpm or rad/s")


def _wrong_dimension(text: str, unit: str, dimension: str) -> str:
    message = (
        f"'{unit}' isn't a unit of {dimension}: expected something like {SHOWN_UNITS[dimension]}"
    )
    if re.search(r"\blbs?\b|\bkg\b", text) and "stiffness" in dimension:
        message += " (lb and kg are masses: write lbf or kgf for a force)"
    return message


def measures(text: str, dimension: str) -> bool:
    """Whether a quantity given as `text` carries a unit of `dimension`."""
    match = _NUMBER_AND_UNIT.fullmatch(text)
    if not match or not match[2]:
        return False
    try:
        unit_factor(match[2], dimension)
    except ValueError:
        return False
    return True


@dataclass(frozen=True)
class Quantity:
    """How a physical number is read: its dimension (or either of two) and its sign.

    `sign` is "positive", "not negative" or "any".
    """

    dimension: str
    sign: Literal["positive", "not negative", "any"] = "any"
    or_dimension: str | None = None

    def read(self, value: object) -> float:
        """`value` in SI.

        Raises a Pydantic error for a wrong type, unit, sign or size.
        """
        kind = type(value)
        if kind is float or kind is int:
            number = self._float(value)
        elif kind is str:
            number = self._with_unit(str(value))
        else:
            raise fault(f"expected a number in {self.unit} or a string with a unit")
        return self._in_range(number)

    def _float(self, value: Any) -> float:
        try:
            return float(value)
        except OverflowError:
            return math.inf

    def _with_unit(self, text: str) -> float:
        match = _NUMBER_AND_UNIT.fullmatch(text) if len(text) <= 96 else None
        if not match:
            raise fault(f'expected a number and its unit, like "1.5 {SHOWN_UNITS[self.dimension]}"')
        if not match[2]:
            raise fault(f"the string has no unit: write the number in {self.unit} without quotes")
        try:
            factor = unit_factor(match[2], self.dimension)
        except ValueError as first:
            if not self.or_dimension:
                raise fault(str(first)) from None
            try:
                factor = unit_factor(match[2], self.or_dimension)
            except ValueError:
                raise fault(str(first)) from None
        return float(match[1]) * factor

    def _in_range(self, number: float) -> float:
        if number == 0.0:
            if self.sign == "positive":
                raise fault("must be greater than zero")
            return 0.0  # one zero, so that -0.0 gives no other identity
        if not math.isfinite(number):
            raise fault("must be a finite number")
        if number < 0.0 and self.sign != "any":
            raise fault("must not be negative")
        if abs(number) < SMALLEST and self.dimension == "length" and self.sign == "any":
            return 0.0  # what roundoff leaves of a coordinate
        if not SMALLEST <= abs(number) <= LARGEST:
            raise fault(f"must lie between {SMALLEST:g} and {LARGEST:g} in size")
        return number

    @property
    def unit(self) -> str:
        """The SI unit as shown to people."""
        if self.or_dimension:
            return f"{SHOWN_UNITS[self.dimension]} or {SHOWN_UNITS[self.or_dimension]}"
        return SHOWN_UNITS[self.dimension]

    def __get_pydantic_core_schema__(self, _: Any, __: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(
        self, _: CoreSchema, __: GetJsonSchemaHandler
    ) -> dict[str, Any]:
        number: dict[str, Any] = {"type": "number", "maximum": LARGEST}
        if self.sign == "positive":
            number["exclusiveMinimum"] = 0
        elif self.sign == "not negative":
            number["minimum"] = 0
        else:
            number["minimum"] = -LARGEST
        text = {"type": "string", "pattern": r"^[+-]?[0-9.]+([eE][+-]?[0-9]+)? *[^0-9 .].*$"}
        return {"anyOf": [number, text], "x-unit": self.unit}


Mass = Annotated[float, Quantity("mass", "not negative")]
PositiveMass = Annotated[float, Quantity("mass", "positive")]
Length = Annotated[float, Quantity("length")]
PositiveLength = Annotated[float, Quantity("length", "positive")]
NonNegativeLength = Annotated[float, Quantity("length", "not negative")]
Area = Annotated[float, Quantity("area", "positive")]
SecondMoment = Annotated[float, Quantity("second moment of area", "positive")]
Inertia = Annotated[float, Quantity("inertia", "not negative")]
InertiaProduct = Annotated[float, Quantity("inertia")]
Gravity = Annotated[float, Quantity("acceleration", "not negative")]
Force = Annotated[float, Quantity("force")]
Stiffness = Annotated[float, Quantity("stiffness")]
PositiveStiffness = Annotated[float, Quantity("stiffness", "positive")]
RotationalStiffness = Annotated[float, Quantity("rotational stiffness")]
PositiveRotationalStiffness = Annotated[float, Quantity("rotational stiffness", "positive")]
AnyStiffness = Annotated[float, Quantity("stiffness", or_dimension="rotational stiffness")]
Damping = Annotated[float, Quantity("damping", "not negative")]
SignedDamping = Annotated[float, Quantity("damping")]
RotationalDamping = Annotated[float, Quantity("rotational damping", "not negative")]
AnyDamping = Annotated[float, Quantity("damping", "not negative", "rotational damping")]
Moment = Annotated[float, Quantity("moment")]
AnyForce = Annotated[float, Quantity("force", or_dimension="moment")]
AnyDisplacement = Annotated[float, Quantity("length", or_dimension="angle")]
AnyVelocity = Annotated[float, Quantity("velocity", or_dimension="angular velocity")]
AnyAcceleration = Annotated[float, Quantity("acceleration", or_dimension="angular acceleration")]
MassEccentricity = Annotated[float, Quantity("mass eccentricity", "positive")]
Pressure = Annotated[float, Quantity("pressure", "positive")]
Density = Annotated[float, Quantity("density", "positive")]
Ratio = Annotated[float, Quantity("ratio", "not negative")]
SignedRatio = Annotated[float, Quantity("ratio")]
PositiveRatio = Annotated[float, Quantity("ratio", "positive")]
Rate = Annotated[float, Quantity("rate", "not negative")]
Time = Annotated[float, Quantity("time", "not negative")]
PositiveTime = Annotated[float, Quantity("time", "positive")]
Frequency = Annotated[float, Quantity("frequency", "positive")]
Speed = Annotated[float, Quantity("speed", "not negative")]
PositiveSpeed = Annotated[float, Quantity("speed", "positive")]

Point = Annotated[list[Length], Field(min_length=3, max_length=3)]
Component = Annotated[float, Field(strict=True, allow_inf_nan=False, ge=-LARGEST, le=LARGEST)]
Direction = Annotated[list[Component], Field(min_length=3, max_length=3)]

# A letter or digit of any script first. Marks are what many scripts write their vowels with.
_NAME = re.compile(r"[^\W_][\w .\-]{0,63}")
NAME_PATTERN = r"^[^\W_][\w .\-]{0,63}$"


def _is_name(text: str) -> bool:
    bare = "".join(letter for letter in text if unicodedata.category(letter) not in ("Mn", "Mc"))
    return len(text) <= 64 and text[:1] == bare[:1] and bool(_NAME.fullmatch(bare))


def _name(text: str) -> str:
    text = text if text.isascii() else unicodedata.normalize("NFC", text)
    if not (_NAME.fullmatch(text) or _is_name(text)):
        raise fault(
            "a name has 1 to 64 characters, starts with a letter or a digit, and goes on with "
            "letters, digits, spaces and . _ -"
        )
    if text == "ground":
        raise fault("the name 'ground' is reserved")
    return text


def split_degree_of_freedom(path: str) -> tuple[str, Motion] | None:
    """`BODY/MOTION` in its two parts, or None if `path` isn't one."""
    body, slash, motion = path.rpartition("/")
    if not slash or motion not in MOTIONS or not _is_name(body) or body == "ground":
        return None
    return body, motion


def _degree_of_freedom(path: str) -> str:
    path = path if path.isascii() else unicodedata.normalize("NFC", path)
    if split_degree_of_freedom(path) is None:
        raise fault("a degree of freedom is written BODY/MOTION, like 'skid/z'")
    return path


def _end(text: str) -> str:
    return text if text == "ground" else _name(text)


def _in_order(motions: list[Motion]) -> list[Motion]:
    if len(set(motions)) < len(motions):
        raise fault("a motion stands here twice")
    return sorted(motions, key=MOTIONS.index)


Name = Annotated[
    str,
    AfterValidator(_name),
    Field(json_schema_extra={"pattern": NAME_PATTERN, "minLength": 1, "maxLength": 64}),
]
End = Annotated[
    str,
    AfterValidator(_end),
    Field(json_schema_extra={"pattern": NAME_PATTERN, "minLength": 1, "maxLength": 64}),
]
DegreeOfFreedom = Annotated[
    str,
    AfterValidator(_degree_of_freedom),
    Field(json_schema_extra={"pattern": r"^[^\W_][\w .\-]{0,63}/r?[xyz]$"}),
]
Motions = Annotated[list[Motion], AfterValidator(_in_order)]
