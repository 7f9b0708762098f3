"""From the posted bodies and connections to the machine that compute assembles."""

from math import inf, pi

import numpy as np

from schemas.connections import (
    Beam,
    Bearing,
    Damper,
    Gear,
    Link,
    Pad,
    Pendulum,
    Shaft,
    Spring,
)
from schemas.connections.beam import PropertiesSection, RectangleSection, RoundSection, TubeSection
from schemas.connections.bearing import BearingPoint
from schemas.connections.ends import DampingPerAxis, StiffnessPerAxis
from schemas.connections.pad import CircleFooting
from schemas.connections.trains import ShaftSection
from schemas.materials import MATERIALS
from schemas.quantities import MOTIONS
from schemas.system import BodiesSystem, Body, InertiaTensor
from service.compute import beams, half_space
from service.compute import machine as m

NUMBER_OF = {motion: number for number, motion in enumerate(MOTIONS)}


def machine_of(system: BodiesSystem) -> m.Machine:
    """The posted bodies and connections as the assembly takes them."""
    return _Translation(system).machine()


class _Translation:
    """Walks over the connections of a system and collects what they come to."""

    def __init__(self, system: BodiesSystem) -> None:
        self.system = system
        self.places = {body.name: index for index, body in enumerate(system.bodies)}
        self.springs: list[m.Spring] = []
        self.links: list[m.Link] = []
        self.gears: list[m.Gear] = []
        self.flywheels: list[m.Flywheel] = []
        self.beams: list[m.Beam] = []
        self.bearings: list[m.Bearing] = []

    def machine(self) -> m.Machine:
        for connection in self.system.connections:
            self._add(connection)
        return m.Machine(
            bodies=tuple(_body(body) for body in self.system.bodies),
            springs=tuple(self.springs),
            links=tuple(self.links),
            gears=tuple(self.gears),
            flywheels=tuple(self.flywheels),
            beams=tuple(self.beams),
            bearings=tuple(self.bearings),
            connection_names=tuple(part.name for part in self.system.connections),
        )

    def _add(
        self, part: Spring | Damper | Pendulum | Link | Shaft | Gear | Beam | Bearing | Pad
    ) -> None:
        match part:
            case Spring():
                self.springs.append(_spring(part, self.system, self.places))
            case Damper():
                self.springs.append(_damper(part, self.system, self.places))
            case Pendulum():
                self.springs.append(_pendulum(part, self.system, self.places))
            case Link():
                self.links.append(_link(part, self.system, self.places))
            case Shaft():
                self._shaft(part)
            case Gear():
                self.gears.append(_gear(part, self.system, self.places))
            case Beam():
                self.beams.append(_beam(part, self.system, self.places))
            case Bearing():
                self.bearings.append(_bearing(part, self.places))
            case Pad():
                self.springs.append(_pad(part, self.system, self.places))

    def _shaft(self, shaft: Shaft) -> None:
        """A torsion spring; the sections' inertia goes to the two ends by the lever rule."""
        ends = _ends(shaft.between, self.places)
        about = _twist_direction(shaft, self.system, ends)
        stiffness, inertias = _shaft_constants(shaft)
        self.springs.append(
            m.Spring(
                shaft.name,
                ends,
                (0.0, 0.0, 0.0),
                (0.0, 0.0, 0.0, stiffness, 0.0, 0.0),
                (0.0, 0.0, 0.0, shaft.damping or 0.0, 0.0, 0.0),
                shaft.loss_factor or 0.0,
                (about, about, about),
            )
        )
        self.flywheels.extend(
            m.Flywheel(shaft.name, end, about, inertia)
            for end, inertia in zip(ends, inertias, strict=True)
            if end != m.GROUND and inertia > 0.0
        )


def _vector(point: list[float]) -> m.Vector:
    return (point[0], point[1], point[2])


def _body(body: Body) -> m.Body:
    able = body.motions or ()
    return m.Body(
        body.name,
        _vector(body.at),
        body.mass,
        _tensor(body),
        tuple(NUMBER_OF[motion] for motion in able if motion not in body.held),
        tuple(NUMBER_OF[motion] for motion in able),
        None if body.spin is None else m.Spin("xyz".index(body.spin.axis), body.spin.ratio),
    )


def _tensor(body: Body) -> tuple[float, float, float, float, float, float]:
    inertia = body.inertia
    if isinstance(inertia, InertiaTensor):
        return (inertia.xx, inertia.yy, inertia.zz, inertia.xy, inertia.yz, inertia.xz)
    about = [motion for motion in body.motions or () if motion[0] == "r"]
    xx, yy, zz = (inertia or 0.0 if axis in about else 0.0 for axis in ("rx", "ry", "rz"))
    return (xx, yy, zz, 0.0, 0.0, 0.0)


def _ends(between: list[str], places: dict[str, int]) -> tuple[int, int]:
    first, second = (places.get(end, m.GROUND) for end in between)
    return first, second


def _six(value: StiffnessPerAxis | DampingPerAxis | float | None, axis: int) -> tuple[float, ...]:
    if value is None:
        return (0.0,) * 6
    if isinstance(value, StiffnessPerAxis | DampingPerAxis):
        return (value.x, value.y, value.z, value.rx, value.ry, value.rz)
    return tuple(value if number == axis else 0.0 for number in range(6))


def _only_axis(part: Spring | Damper, system: BodiesSystem, places: dict[str, int]) -> int:
    """Where a single number acts: along `along` (then the part's own x), or the only motion."""
    if part.along is not None:
        return 0
    ends = [system.bodies[places[end]] for end in part.between if end in places]
    motions = sorted(NUMBER_OF[motion] for body in ends for motion in body.motions or ())
    return motions[0] if motions else 0


def _own_axes(part: Spring | Damper) -> m.Rotation:
    """The part's own x, y, z as rows."""
    if part.along is not None:
        length = float(np.linalg.norm(part.along))
        own = _vector([value / length for value in part.along])
        return (own, own, own)
    if part.axes is None:
        return m.UPRIGHT
    first, second, third = (_vector(list(column)) for column in zip(*part.axes, strict=True))
    rows = (first, second, third)
    if all(abs(_dot(p, q) - (p is q)) < 1e-14 for p in rows for q in rows):
        return rows
    return _nearest_rotation(part.axes)


def _dot(p: m.Vector, q: m.Vector) -> float:
    return p[0] * q[0] + p[1] * q[1] + p[2] * q[2]


def _nearest_rotation(axes: list[list[float]]) -> m.Rotation:
    """For axes read off a drawing: the orthogonal factor of the polar decomposition, as rows."""
    left, _, right = np.linalg.svd(axes)
    first, second, third = (left @ right).T.tolist()
    return (_vector(first), _vector(second), _vector(third))


def _at(part: Spring | Damper | Link) -> m.Vector:
    return _vector(part.at or [0.0, 0.0, 0.0])


def _spring(spring: Spring, system: BodiesSystem, places: dict[str, int]) -> m.Spring:
    axis = _only_axis(spring, system, places)
    return m.Spring(
        spring.name,
        _ends(spring.between, places),
        _at(spring),
        _six(spring.stiffness, axis),
        _six(spring.damping, axis),
        spring.loss_factor or 0.0,
        _own_axes(spring),
    )


def _damper(damper: Damper, system: BodiesSystem, places: dict[str, int]) -> m.Spring:
    axis = _only_axis(damper, system, places)
    return m.Spring(
        damper.name,
        _ends(damper.between, places),
        _at(damper),
        (0.0,) * 6,
        _six(damper.damping, axis),
        axes=_own_axes(damper),
    )


def _pendulum(pendulum: Pendulum, system: BodiesSystem, places: dict[str, int]) -> m.Spring:
    place = places[pendulum.body]
    body = system.bodies[place]
    k = body.mass * system.gravity / pendulum.length
    return m.Spring(pendulum.name, (m.GROUND, place), _vector(body.at), (k, k, 0.0, 0.0, 0.0, 0.0))


def _link(link: Link, system: BodiesSystem, places: dict[str, int]) -> m.Link:
    ends = [system.bodies[places[end]] for end in link.between if end in places]
    shared = set.intersection(*(set(body.motions or ()) for body in ends))
    at = link.at or ends[0].at
    if link.at is None and len(ends) == 2 and not _turns(ends[1]) and _turns(ends[0]):
        at = ends[1].at
    axes = tuple(NUMBER_OF[motion] for motion in link.motions or sorted(shared, key=MOTIONS.index))
    return m.Link(link.name, _ends(link.between, places), _vector(at), axes)


def _turns(body: Body) -> bool:
    return any(motion[0] == "r" for motion in body.motions or ())


def _shaft_constants(shaft: Shaft) -> tuple[float, tuple[float, float]]:
    """Torsional stiffness (N·m/rad), and inertia (kg·m²) that goes to either end.

    1/k = Σ L/(G·J). A section's inertia ρ·J·L turns with its middle, whose angle lies between those
    of the ends as the flexibility up to it to the whole: it is shared in that proportion.
    """
    if shaft.stiffness is not None:
        return shaft.stiffness, (0.0, 0.0)
    sections = shaft.sections or []
    flexibilities = [_section_flexibility(section) for section in sections]
    whole = sum(flexibilities)
    first = second = passed = 0.0
    for section, flexibility in zip(sections, flexibilities, strict=True):
        share = (passed + flexibility / 2.0) / whole
        inertia = 0.0 if shaft.massless else _section_inertia(section)
        first += inertia * (1.0 - share)
        second += inertia * share
        passed += flexibility
    return 1.0 / whole, (first, second)


def _polar(section: ShaftSection) -> float:
    return pi * (section.outer_diameter**4 - section.inner_diameter**4) / 32.0


def _section_flexibility(section: ShaftSection) -> float:
    modulus = section.shear_modulus
    if modulus is None:
        modulus = MATERIALS[str(section.material)].shear_modulus
    return section.length / (modulus * _polar(section))


def _section_inertia(section: ShaftSection) -> float:
    density = section.density
    if density is None:
        density = MATERIALS[str(section.material)].density
    return density * _polar(section) * section.length


def _twist_direction(shaft: Shaft, system: BodiesSystem, ends: tuple[int, int]) -> m.Vector:
    """About `axis`, the only rotation of the bodies, or the line between them."""
    if shaft.axis is not None:
        return m.UPRIGHT[NUMBER_OF[shaft.axis] - 3]
    bodies = [system.bodies[end] for end in ends if end != m.GROUND]
    turns = [{motion for motion in body.motions or () if motion[0] == "r"} for body in bodies]
    shared = set.intersection(*turns)
    if len(shared) == 1:
        return m.UPRIGHT[NUMBER_OF[shared.pop()] - 3]
    line = np.subtract(bodies[1].at, bodies[0].at)
    if not line.any():
        raise m.Unsound(
            "the bodies have several rotations and one place: say with `axis` which one",
            "connection",
            shaft.name,
            "between",
        )
    x, y, z = (line / np.linalg.norm(line)).tolist()
    return (x, y, z)


def _gear(gear: Gear, system: BodiesSystem, places: dict[str, int]) -> m.Gear:
    driver, driven = (
        (places[end], _wheel_axis(gear, system.bodies[places[end]])) for end in gear.between
    )
    radius = 1.0 if gear.pitch_radius is None else gear.pitch_radius[1]
    return m.Gear(gear.name, driver, driven, gear.ratio, gear.mesh_stiffness, radius)


def _wheel_axis(gear: Gear, body: Body) -> int:
    if gear.axis is not None:
        return NUMBER_OF[gear.axis]
    return next(NUMBER_OF[motion] for motion in body.motions or () if motion[0] == "r")


def _beam(beam: Beam, system: BodiesSystem, places: dict[str, int]) -> m.Beam:
    ends = _ends(beam.between, places)
    first, second = (_vector(system.bodies[end].at) for end in ends)
    if np.linalg.norm(np.subtract(second, first)) == 0.0:
        raise m.Unsound("the two bodies are at the same place", "connection", beam.name, "between")
    up = None if beam.up is None else _vector(beam.up)
    if up is not None and np.linalg.norm(np.cross(np.subtract(second, first), up)) == 0.0:
        raise m.Unsound("lies along the beam", "connection", beam.name, "up")
    return m.Beam(
        beam.name,
        ends,
        beam.elements,
        beams.own_axes(first, second, up),
        _beam_section(beam),
        beam.axial_force,
        beam.spin_ratio,
    )


def _beam_section(beam: Beam) -> m.Section:
    material = MATERIALS.get(beam.material or "")
    E = beam.youngs_modulus or (material.youngs_modulus if material else 0.0)
    density = beam.density or (material.density if material else 0.0)
    nu = beam.poissons_ratio
    if nu is None:
        nu = material.poissons_ratio if material else 0.3
    G = E / (2.0 * (1.0 + nu))
    area, iy, iz, j, shear_y, shear_z = _properties(beam, nu)
    deep = beam.theory == "timoshenko"
    return m.Section(
        EA=E * area,
        GJ=G * j,
        EIy=E * iy,
        EIz=E * iz,
        GAy=G * shear_y if deep else inf,
        GAz=G * shear_z if deep else inf,
        mass=density * area,
        polar=density * (iy + iz),
        Iy=density * iy if deep else 0.0,
        Iz=density * iz if deep else 0.0,
    )


def _properties(beam: Beam, nu: float) -> tuple[float, float, float, float, float, float]:
    """Area, iy, iz, torsion constant, shear areas in y and z.

    Shear coefficients by Cowper (Journal of Applied Mechanics 33, 1966); torsion of a rectangle by
    Saint-Venant's series to its usual closed approximation (Young and Budynas, Roark's Formulas for
    Stress and Strain, from memory).
    """
    section = beam.section
    if isinstance(section, PropertiesSection):
        return (
            section.area,
            section.iy,
            section.iz,
            section.j,
            section.shear_area_y or section.area,
            section.shear_area_z or section.area,
        )
    if isinstance(section, RectangleSection):
        b, h = section.width, section.height
        shear = b * h * 10 * (1 + nu) / (12 + 11 * nu)
        return (b * h, b * h**3 / 12, h * b**3 / 12, _rectangle_torsion(b, h), shear, shear)
    outer, inner = _diameters(section)
    area = pi * (outer**2 - inner**2) / 4
    second = pi * (outer**4 - inner**4) / 64
    n = (inner / outer) ** 2  # (1 + n)² and n below are Cowper's hollow circle; n = 0 is the solid
    shear = area * 6 * (1 + nu) * (1 + n) ** 2 / ((7 + 6 * nu) * (1 + n) ** 2 + (20 + 12 * nu) * n)
    return (area, second, second, 2 * second, shear, shear)


def _diameters(section: RoundSection | TubeSection) -> tuple[float, float]:
    if isinstance(section, RoundSection):
        return section.diameter, 0.0
    return section.outer_diameter, section.inner_diameter


def _rectangle_torsion(width: float, height: float) -> float:
    long, short = max(width, height), min(width, height)
    ratio = short / long
    return long * short**3 * (1 / 3 - 0.21 * ratio * (1 - ratio**4 / 12))


def _bearing(bearing: Bearing, places: dict[str, int]) -> m.Bearing:
    points = bearing.points or [
        BearingPoint(rpm=0.0, stiffness=bearing.stiffness or [], damping=bearing.damping)
    ]
    none = [[0.0, 0.0], [0.0, 0.0]]
    first, second = {"x": (1, 2), "y": (2, 0), "z": (0, 1)}[bearing.axis]
    return m.Bearing(
        bearing.name,
        _ends(bearing.between, places),
        _vector(bearing.at or [0.0, 0.0, 0.0]),
        (m.UPRIGHT[first], m.UPRIGHT[second]),
        np.array([point.rpm for point in points]),
        np.array([point.stiffness for point in points]),
        np.array([point.damping or none for point in points]),
    )


def _pad(pad: Pad, system: BodiesSystem, places: dict[str, int]) -> m.Spring:
    """Half-space springs and dampers at the middle of the footing."""
    ends = _ends(pad.between, places)
    footing = pad.footing
    radii = (
        half_space.circle(footing.radius)
        if isinstance(footing, CircleFooting)
        else half_space.rectangle(footing.length, footing.width)
    )
    soil = half_space.Soil(pad.shear_modulus, pad.poissons_ratio, pad.density)
    at = _vector(pad.at or [0.0, 0.0, 0.0])
    block = system.bodies[next(end for end in ends if end != m.GROUND)]
    return m.Spring(
        pad.name,
        ends,
        at,
        half_space.stiffness(soil, radii),
        half_space.damping(soil, radii, _inertia_about(block, at)),
    )


def _inertia_about(body: Body, point: m.Vector) -> tuple[float, float, float]:
    """Moments of inertia about x, y, z through `point` (parallel-axis theorem)."""
    xx, yy, zz, *_ = _tensor(body)
    x, y, z = (a - b for a, b in zip(body.at, point, strict=True))
    return (
        xx + body.mass * (y * y + z * z),
        yy + body.mass * (x * x + z * z),
        zz + body.mass * (x * x + y * y),
    )
