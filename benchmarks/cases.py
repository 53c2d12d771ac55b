"""Cases from handbooks and papers, built as plates and solved.

The file reference_static.json holds problems with values computed without finite
elements (series, closed forms, collocation with exact corner terms) and, beside them,
the published figure where one is known. Everything is scaled to D = 1, p = 1, F = 1.
"""

import json
import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np

import kplate as kp

FILE = Path(__file__).with_name("reference_static.json")
THICKNESS = 1e-2
# D = 1e4 N m keeps E within what is usual; results are divided by it.
STIFFNESS = 1e4
SUPPORTS = {s.name: s for s in (kp.CLAMPED, kp.SIMPLY_SUPPORTED, kp.FREE, kp.GUIDED)}
# How far to its own side, in m, a value on a step is read; the plates are 1 m wide.
HAIR = 1e-9


@dataclass(frozen=True, kw_only=True)
class Row:
    """One number of one case beside what kplate finds.

    Parameters
    ----------
    case : str
        The case.
    quantity : str
        What, and where.
    value : float
        The reference value, to `digits` significant digits.
    digits : int
        How many digits of it are meant.
    computed : float
        What kplate finds.
    scale : float
        Largest reference value of the same kind in the case, for small numbers.
    source : str
        How the value was computed.
    published : float or None
        The figure in print.
    publication : str
        Where it is printed, marked where recalled from memory.
    """

    case: str
    quantity: str
    value: float
    digits: int
    computed: float
    scale: float
    source: str
    published: float | None
    publication: str

    @property
    def deviation(self) -> float:
        """Share by which the magnitude is too large, of value or 2 % of the scale."""
        larger = max(abs(self.value), 0.02 * self.scale)
        return math.copysign(1.0, self.value) * (self.computed - self.value) / larger


@cache
def reference() -> dict[str, Any]:
    """Contents of the file."""
    data: dict[str, Any] = json.loads(FILE.read_text("utf-8"))
    return data


def records() -> list[dict[str, Any]]:
    """All problems."""
    found: list[dict[str, Any]] = reference()["records"]
    return found


def record(name: str) -> dict[str, Any]:
    """Return the problem of this name."""
    return next(r for r in records() if r["id"] == name)


def plate(problem: dict[str, Any]) -> kp.Plate:
    """Build the plate of a problem."""
    nu = problem["nu"]
    stated = problem["outline"]
    if "polygon" in stated:
        outline = kp.Outline.polygon(stated["polygon"], sides=stated["sides"])
    else:
        circle = stated["circle"]
        outline = kp.Outline.circle(
            tuple(circle["centre"]), radius=circle["radius"], side=circle["side"]
        )
    for hole in problem["holes"]:
        outline = outline.cut(_hole(hole))
    for zone in problem.get("zones", ()):
        points = zone["polygon"]
        sides = [f"{zone['name']}-{k}" for k in range(len(points))]
        shape = kp.Polygon(points=points, sides=sides)
        outline = outline.zone(shape, name=zone["name"])
    for seam in problem.get("seams", ()):
        outline = outline.seam(seam["points"], name=seam["name"])
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


def load(problem: dict[str, Any]) -> Any:
    """Build the load of a problem."""
    stated = problem["load"]
    match stated["kind"]:
        case "uniform":
            return kp.Pressure(stated["pressure"], zone=stated.get("zone"))
        case "linear":
            at_origin, (gx, gy) = stated["at_origin"], stated["gradient"]
            return kp.PressureField(lambda x, y: at_origin + gx * x + gy * y)
        case "patch":
            return kp.RectanglePatch(
                force=stated["force"],
                centre=tuple(stated["centre"]),
                size=tuple(stated["size"]),
            )
        case "point":
            return kp.PointForce(force=stated["force"], at=tuple(stated["at"]))
        case "line":
            return kp.LineForce(force=stated["force"], along=stated["along"])
        case "edge moment":
            return kp.EdgeMoment(moment=stated["moment"], along=stated["along"])
    raise ValueError(f"unknown load {stated['kind']!r}")


def rows(
    problem: dict[str, Any], *, triangles: int | None, element: str = "auto"
) -> Iterator[Row]:
    """Solve a problem and set every number beside its reference."""
    solution = kp.solve(
        plate(problem), [load(problem)], triangles=triangles, element=element
    )
    publications = reference()["publications"]
    largest: dict[str, float] = {}
    for item in problem["quantities"]:
        kind = _kind(item["quantity"])
        largest[kind] = max(largest.get(kind, 0.0), abs(item["value"]))
    for item in problem["quantities"]:
        publication = item.get("publication") or ""
        short = publication.split(",")[0].split(" ")[0]
        if short in publications:
            publication = publication.replace(short, publications[short], 1)
        if item.get("from_memory"):
            publication += " (from memory)"
        x, y = item["at"]
        side = (
            " toward ({:g}, {:g})".format(*item["toward"]) if "toward" in item else ""
        )
        yield Row(
            case=problem["id"],
            quantity=f"{item['quantity']} at ({x:.4g}, {y:.4g}){side}",
            value=item["value"],
            digits=item["digits"],
            computed=computed(solution, item),
            scale=largest[_kind(item["quantity"])],
            source=reference()["sources"][item["source"]],
            published=item.get("published"),
            publication=publication,
        )


def computed(solution: kp.Solution, item: dict[str, Any]) -> float:
    """What kplate finds for one quantity, scaled to D = 1."""
    at, quantity = [item["at"]], item["quantity"]
    if "toward" in item:
        at = [np.add(item["at"], HAIR * np.array(item["toward"]))]
    if quantity == "deflection":
        return float(solution.deflection(at)[0]) * STIFFNESS
    if quantity == "line reaction":
        return _line_reaction(solution, item["at"])
    if quantity in ("corner force", "point reaction"):
        found = solution.reactions()
        forces = found.corners if quantity == "corner force" else found.points
        return _nearest([one.force for one in forces], item["at"])
    moments = solution.moments(at)[0]
    if quantity == "moment":
        nx, ny = item["normal"]
        return float(moments @ [nx * nx, ny * ny, 2 * nx * ny])
    if quantity in ("m_1", "m_2"):
        principal, _ = kp.principal_moments(moments)
        return float(principal[int(quantity[-1]) - 1])
    return float(moments[("m_xx", "m_yy", "m_xy").index(quantity)])


def _nearest(values: Sequence[kp.Value], at: tuple[float, float]) -> float:
    """Of values at places the one nearest to a place."""
    places = np.array([value.place for value in values])
    return values[int(np.hypot(*(places - at).T).argmin())].value


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


def _kind(quantity: str) -> str:
    """Quantities that are small against each other's largest."""
    return "moment" if quantity.startswith("m") else quantity


def _hole(hole: dict[str, Any]) -> kp.Circle | kp.Polygon:
    if "circle" in hole:
        circle = hole["circle"]
        return kp.Circle(
            centre=tuple(circle["centre"]), radius=circle["radius"], name=circle["name"]
        )
    return kp.Polygon(points=hole["polygon"], sides=hole["sides"])
