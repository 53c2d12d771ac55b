"""Records as plates and loads, and their numbers as kplate finds them.

Everything is scaled to D = 1, p = 1, F = 1.
"""

import math
from collections.abc import Sequence
from typing import Any

import numpy as np

import kplate as kp
from kplate.errors import InputError

THICKNESS = 1e-2
# D = 1e4 N m keeps E within what is usual; results are divided by it.
STIFFNESS = 1e4
SUPPORTS = {s.name: s for s in (kp.CLAMPED, kp.SIMPLY_SUPPORTED, kp.FREE, kp.GUIDED)}
# How far to its own side, in m, a value on a step is read; the plates are 1 m wide.
HAIR = 1e-9
DEEP = 100.0  # m above the origin: the surface of a liquid that is off the plate


def plate(problem: dict[str, Any]) -> kp.Plate:
    """Build the plate of a record."""
    nu = problem["nu"]
    outline = _outline(problem["outline"])
    for hole in problem.get("holes", ()):
        outline = outline.cut(_hole(hole))
    for zone in problem.get("zones", ()):
        points = zone["polygon"]
        sides = [f"{zone['name']}-{k}" for k in range(len(points))]
        shape = kp.Polygon(points=points, sides=sides)
        outline = outline.zone(shape, name=zone["name"])
    for seam in problem.get("seams", ()):
        bulges = seam.get("bulges", ())
        outline = outline.seam(seam["points"], name=seam["name"], bulges=bulges)
    for mark in problem.get("marks", ()):
        outline = outline.mark(tuple(mark["at"]), name=mark["name"])
    E = 12.0 * (1.0 - nu**2) * STIFFNESS / THICKNESS**3
    return kp.Plate(
        outline=outline,
        thickness=THICKNESS,
        material=kp.Isotropic(name="reference", E=E, nu=nu),
        supports={k: SUPPORTS[v] for k, v in problem["supports"].items()},
        zones={
            zone["name"]: kp.Section(thickness=zone["thickness"] * THICKNESS)
            for zone in problem.get("zones", ())
        },
    )


def loads(problem: dict[str, Any]) -> list[Any]:
    """Build the loads of a record."""
    stated = problem["load"]
    several = stated["loads"] if stated["kind"] == "several" else [stated]
    return [load for one in several for load in _loads(one)]


def computed(solution: kp.Solution, item: dict[str, Any]) -> float:
    """What kplate finds for one number, scaled to D = 1."""
    at, quantity = [item["at"]], item["quantity"]
    if "toward" in item:
        at = [np.add(item["at"], HAIR * np.array(item["toward"]))]
    if quantity == "deflection":
        return float(solution.deflection(at)[0]) * STIFFNESS
    if quantity == "shear":
        return float(solution.shears(at)[0] @ item["normal"])
    if quantity == "line reaction":
        return _line_reaction(solution, item["at"])
    if quantity in ("corner force", "point reaction"):
        found = solution.reactions()
        forces = found.corners if quantity == "corner force" else found.points
        return _nearest([one.force for one in forces], item["at"]).value
    moments = solution.moments(at)[0]
    if quantity == "moment":
        nx, ny = item["normal"]
        return float(moments @ [nx * nx, ny * ny, 2 * nx * ny])
    if quantity in ("m_1", "m_2"):
        principal, _ = kp.principal_moments(moments)
        return float(principal[int(quantity[-1]) - 1])
    return float(moments[("m_xx", "m_yy", "m_xy").index(quantity)])


def kind(quantity: str) -> str:
    """Quantities that are small against each other's largest."""
    return "moment" if quantity.startswith("m") else quantity


def _outline(stated: dict[str, Any]) -> kp.Outline:
    if "polygon" in stated:
        bulges = stated.get("bulges", ())
        sides = stated.get("sides")
        return kp.Outline.polygon(stated["polygon"], sides=sides, bulges=bulges)
    if "ellipse" in stated:
        own = stated["ellipse"]
        centre, size = tuple(own["centre"]), tuple(own["size"])
        return kp.Outline.of(kp.Ellipse(centre=centre, size=size, name=own["side"]))
    own = stated["circle"]
    centre, radius = tuple(own["centre"]), own["radius"]
    return kp.Outline.circle(centre, radius=radius, side=own["side"])


def _hole(hole: dict[str, Any]) -> kp.Circle | kp.Polygon:
    if "circle" in hole:
        circle = hole["circle"]
        return kp.Circle(
            centre=tuple(circle["centre"]), radius=circle["radius"], name=circle["name"]
        )
    return kp.Polygon(points=hole["polygon"], sides=hole["sides"])


def _loads(stated: dict[str, Any]) -> list[Any]:
    """Loads of one statement; a linear pressure as a liquid and an even one.

    As a function kplate could not know that it is linear.
    """
    match stated["kind"]:
        case "uniform":
            return [kp.Pressure(stated["pressure"], zone=stated.get("zone"))]
        case "linear":
            steep = math.hypot(*stated["gradient"])
            up = tuple(-slope / steep for slope in stated["gradient"])
            liquid = kp.Hydrostatic(level=DEEP, specific_weight=steep, up=up)
            return [liquid, kp.Pressure(stated["at_origin"] - DEEP * steep)]
        case "sine":
            p, (a, b) = stated["pressure"], stated["size"]
            k, l = math.pi / a, math.pi / b
            return [kp.PressureField(lambda x, y: p * np.sin(k * x) * np.sin(l * y))]
        case "patch":
            centre, size = tuple(stated["centre"]), tuple(stated["size"])
            return [kp.RectanglePatch(force=stated["force"], centre=centre, size=size)]
        case "disc patch":
            centre, r = tuple(stated["centre"]), stated["radius"]
            return [kp.DiscPatch(force=stated["force"], centre=centre, radius=r)]
        case "point":
            return [kp.PointForce(force=stated["force"], at=tuple(stated["at"]))]
        case "line":
            return [kp.LineForce(force=stated["force"], along=stated["along"])]
        case "edge moment":
            return [kp.EdgeMoment(moment=stated["moment"], along=stated["along"])]
    raise InputError(
        f"there is no load of kind {stated['kind']!r}; the kinds are uniform, linear, "
        "sine, patch, disc patch, point, line, edge moment and several."
    )


def _nearest(values: Sequence[kp.Value], at: tuple[float, float]) -> kp.Value:
    """Of values at places the one nearest to a place."""
    places = np.array([value.place for value in values])
    return values[int(np.hypot(*(places - at).T).argmin())]


def _line_reaction(solution: kp.Solution, at: tuple[float, float]) -> float:
    """Line reaction between the two stations nearest to a place."""
    best, value = np.inf, np.nan
    for side in solution.reactions().sides:
        distance = np.hypot(*(side.stations - at).T)
        first, second = np.argsort(distance)[:2]
        if distance[first] < best:
            best = float(distance[first])
            gap = float(np.hypot(*(side.stations[first] - side.stations[second])))
            weight = best / gap if gap > 0.0 else 0.0
            ends = side.line_reaction[[first, second]]
            value = float(ends @ [1.0 - weight, weight])
    return value
