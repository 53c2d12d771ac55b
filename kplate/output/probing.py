"""What a probe and a section read off a result: its fields, by lines between samples.

How far the balanced fields of the dual are from those of the plate's elements is kept
with the result where it was solved for; it is an estimate of the error at a point,
never a bound. Of moments and stresses the whole of the difference is taken, as of one
component it may be small by chance (`kplate.peaks.measures`).
"""

from dataclasses import dataclass
from pathlib import Path

import numpy as np

from kplate.arrays import Floats
from kplate.errors import InputError
from kplate.files import replacing
from kplate.output.result import DEFLECTION, Result
from kplate.output.shades import Shade
from kplate.output.vtk import THICKNESS
from kplate.peaks import Candidates, measures

MOMENTS, SHEARS = "moments [N]", "shears [N per m]"
# Fields whose error the dual tells, by their names without face, component and unit,
# and as what `measures` knows it.
_MEASURED = {
    "moments": "m_xx",
    "principal moments": "m_xx",
    "von Mises": "von Mises",
    "largest principal": "largest principal",
    "shear stress": "shear stress",
}


@dataclass(frozen=True, kw_only=True)
class Reading:
    """What a probe reads.

    Parameters
    ----------
    place : tuple of float
        Where, on the undeformed plate, in m.
    value : float
        The quantity in its unit.
    difference : float or None
        By how much the dual differs there, in that unit; ``None`` where it is not kept.
    left_out : str
        Why there is no finite moment there, or nothing.
    """

    place: tuple[float, float]
    value: float
    difference: float | None
    left_out: str


@dataclass(frozen=True, eq=False, kw_only=True)
class Section:
    """A quantity along a straight line in plan.

    Parameters
    ----------
    start, end : tuple of float
        Its ends in m.
    pieces : ndarray, shape (k, 2)
        Distance from the start in m where the line enters and leaves each triangle.
    values : ndarray, shape (k, 2)
        The quantity there, in its unit.
    """

    start: tuple[float, float]
    end: tuple[float, float]
    pieces: Floats
    values: Floats


def probe(
    result: Result,
    shade: Shade,
    *,
    case: str,
    face: str,
    triangle: int,
    shares: Floats,
) -> Reading:
    """Read a quantity in a small triangle, at barycentric shares (3,)."""
    corners = result.fields.triangles[triangle]
    place = shares @ result.fields.points[corners, :2]
    within = [
        disc.reason
        for disc in result.left_out(case)
        if np.hypot(*(place - disc.place)) < disc.radius
    ]
    off = _difference(result, shade, case, face, triangle, shares)
    return Reading(
        place=(float(place[0]), float(place[1])),
        value=float(shares @ result.shown(case, shade, face)[corners]),
        difference=None if off is None else off / shade.unit.size,
        left_out=within[0] if within else "",
    )


def section(
    result: Result,
    values: Floats,
    start: tuple[float, float],
    end: tuple[float, float],
) -> Section:
    """Cut the plate along a line and read values (n_points,) on it.

    Raises
    ------
    InputError
        If the line has no length, or does not cross the plate.
    """
    first, along = np.array(start), np.subtract(end, start)
    length = float(np.hypot(*along))
    if length == 0.0:
        raise InputError("a section needs two different points.")
    along = along / length
    points, triangles = result.fields.points[:, :2] - first, result.fields.triangles
    across = points @ np.array([-along[1], along[0]])
    # A line through a vertex, or along an edge, is taken a hair beside it.
    across = np.where(across == 0.0, 1e-12 * length, across)
    own = across[triangles]
    above = own > 0.0
    cut = np.flatnonzero(above.any(axis=1) & ~above.all(axis=1))
    own, above = own[cut], above[cut]
    lone = np.where(above.sum(axis=1) == 1, above.argmax(axis=1), above.argmin(axis=1))
    order = (lone[:, None] + np.arange(3)) % 3
    own = np.take_along_axis(own, order, axis=1)
    corners = np.take_along_axis(triangles[cut], order, axis=1)
    share = own[:, :1] / (own[:, :1] - own[:, 1:])

    def between(at_points: Floats) -> Floats:
        found = at_points[corners]
        return found[:, :1] + share * (found[:, 1:] - found[:, :1])

    distance, found = between(points @ along), between(values)
    turned = distance[:, 0] > distance[:, 1]
    distance[turned], found[turned] = distance[turned, ::-1], found[turned, ::-1]
    kept = (distance[:, 1] > 0.0) & (distance[:, 0] < length)
    distance, found = distance[kept], found[kept]
    if not len(distance):
        raise InputError("the section does not cross the plate; choose other points.")
    step = np.maximum(distance[:, 1:] - distance[:, :1], np.finfo(float).tiny)
    slope = (found[:, 1:] - found[:, :1]) / step
    clipped = np.clip(distance, 0.0, length)
    found = found + slope * (clipped - distance)
    order = np.argsort(clipped.sum(axis=1), kind="stable")
    return Section(start=start, end=end, pieces=clipped[order], values=found[order])


def write_section(cut: Section, title: str, path: Path) -> Path:
    """Write a section as a CSV table: distance, place, value, two rows a triangle.

    Raises
    ------
    InputError
        If the file cannot be written.
    """
    path = Path(path)
    distance, values = cut.pieces.ravel(), cut.values.ravel()
    start, end = np.array(cut.start), np.array(cut.end)
    along = (end - start) / np.hypot(*(end - start))
    places = start + distance[:, None] * along
    heading = title.replace('"', '""')
    rows = [f'distance [m],x [m],y [m],"{heading}"']
    rows += [
        f"{s:.9g},{x:.9g},{y:.9g},{value:.9g}"
        for s, (x, y), value in zip(distance, places, values, strict=True)
    ]
    with replacing(path) as temporary:
        temporary.write_text("\n".join([*rows, ""]), encoding="utf-8")
    return path


def _difference(
    result: Result, shade: Shade, case: str, face: str, triangle: int, shares: Floats
) -> float | None:
    """By how much the dual differs at a point, in SI units."""
    corners = result.fields.triangles[triangle]

    def at(array: str) -> Floats:
        return np.asarray(shares @ result.values(case, array)[corners])

    array = shade.array(face)
    base = array.rpartition(" [")[0]
    if not result.has(case, f"balanced {DEFLECTION}"):
        return None
    if array == DEFLECTION:
        return float(abs(at(array) - at(f"balanced {DEFLECTION}")))
    if array == SHEARS:
        return float(np.hypot(*(at(array) - at(f"balanced {SHEARS}"))))
    thickness = result.fields.cell_data.get(THICKNESS)
    if thickness is None:
        return None
    h = float(thickness[0][triangle])
    own = Candidates(
        np.zeros((1, 2)),
        at(MOMENTS)[None],
        at(SHEARS)[None],
        np.array([h]),
        np.array([triangle]),
    )
    other = at(f"balanced {MOMENTS}")[None], at(f"balanced {SHEARS}")[None]
    words = base.removesuffix(f" {face}") if face else base
    if words == "stress":
        return 6.0 / h**2 * float(measures("m_xx", own, *other)[1][0])
    if words in _MEASURED:
        return float(measures(_MEASURED[words], own, *other)[1][0])
    return None
