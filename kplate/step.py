"""Outlines from STEP files, by Gmsh with its OpenCASCADE kernel.

One planar face is taken, wherever it lies in space. One parallel to the xy plane
keeps its coordinates; another is turned into it, with its longest straight edge along x
and the lower left corner of its box in the origin.
"""

import math
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np

from kplate import curves
from kplate.arrays import Floats
from kplate.chaining import Piece, chain, count
from kplate.drawings import Drawing, drawing_of
from kplate.errors import InputError
from kplate.fitting import Arc, as_arcs
from kplate.meshing import gmsh_model
from kplate.polygon import Chords
from kplate.quantities import unit as parse_unit
from kplate.units import Unit

# Points of a plane are this close to it, as a share of its size; directions are level,
# and two lengths or areas equal, to the same share.
FLAT = 1e-7
# A curve whose points lie on a circle to this share of its radius is an arc.
ROUND = 1e-10
# Lengths arrive in mm, whatever the file's own unit: the kernel keeps the unit that was
# asked for last and writes files in it, so that it had better be its usual one.
ARRIVING = 1e-3
# Spans of a curve that is neither a line nor an arc, before they are parted further.
SPANS = 8
_MILLIMETRE = Unit("mm", 1e-3)


def read_step(
    path: Path,
    *,
    unit: str | None = None,
    snap: float | None = None,
    chords: Chords = "ask",
) -> Drawing:
    """Read the outline of a panel from a planar face in a STEP file.

    Parameters
    ----------
    path : Path
        The file; it states its own unit.
    unit : str, optional
        Unit in which places and sizes are named; mm if left out.
    snap : float, optional
        Free ends closer than this, in m, are joined; 1e-4 of the size if left out.
    chords : {"ask", "arc", "polygon"}
        What runs of straight pieces on a circle are, as in `Polygon`.

    Returns
    -------
    Drawing
        Of several planar faces the largest; its notes list the others.

    Raises
    ------
    InputError
        If the file cannot be read or holds no planar face.
    """
    path = Path(path)
    its_unit = _MILLIMETRE if unit is None else parse_unit(unit, "length")
    _check_file(path)
    with gmsh_model(1.0) as gmsh:
        face, notes, ignored = _face(gmsh, path, its_unit)
        found = [_edge(gmsh, tag) for tag in _boundary(gmsh, face)]
    edges = [(kind, ARRIVING * points) for kind, points in found]
    if _level(edges):
        flat = [(kind, points[:, :2]) for kind, points in edges]
    else:
        flat = _turned(edges)
        notes.append("turned into the xy plane, its longest straight edge along x")
    pieces = [
        Piece(start=start, end=end, bulge=bulge, kind="edge", entity=number)
        for number, (kind, points) in enumerate(flat)
        for start, end, bulge in _arcs(kind, points)
    ]
    drawn = chain(pieces, unit=its_unit, snap=snap)
    return drawing_of(drawn, unit=its_unit, chords=chords, notes=notes, ignored=ignored)


def _check_file(path: Path) -> None:
    """Refuse what is no STEP file before Gmsh sees it."""
    shown = repr(str(path))
    try:
        if path.is_dir():
            raise InputError(f"{shown} is a folder; name a .step file.")
        content = path.read_bytes()
    except FileNotFoundError as error:
        raise InputError(f"there is no file {shown}; name a .step file.") from error
    except OSError as error:
        raise InputError(f"cannot read {shown}: {error.strerror or error}.") from error
    if not content.lstrip().startswith(b"ISO-10303-21"):
        raise InputError(f"{shown} is no STEP file; save the face as STEP.")
    if not content.rstrip().endswith(b"END-ISO-10303-21;"):
        raise InputError(
            f"{shown} ends too early: it was not written or copied to its end; save "
            "the face again."
        )


def _face(gmsh: Any, path: Path, unit: Unit) -> tuple[int, list[str], list[str]]:
    """Read the file; return its largest planar face, and the others in words."""
    target = gmsh.option.getString("Geometry.OCCTargetUnit")
    gmsh.option.setString("Geometry.OCCTargetUnit", "MM")
    try:
        gmsh.model.occ.importShapes(str(path), format="step")
        gmsh.model.occ.synchronize()
    except Exception as error:
        raise InputError(
            f"{str(path)!r} is damaged, or no STEP file; save the face again."
        ) from error
    finally:
        gmsh.option.setString("Geometry.OCCTargetUnit", target)
    faces = [tag for _, tag in gmsh.model.getEntities(2)]
    areas = {tag: float(gmsh.model.occ.getMass(2, tag)) for tag in faces}
    plane = [tag for tag in faces if gmsh.model.getType(2, tag) == "Plane"]
    if not plane:
        held = f"{count(len(faces), 'face')}, all curved" if faces else "no face"
        raise InputError(
            f"the file holds {held}; kplate takes a flat panel: save its middle plane, "
            "or one of its flat faces, as STEP."
        )
    largest = max(areas[tag] for tag in plane)
    # Of several as large, as both faces of a solid plate are, the first.
    taken = next(tag for tag in plane if areas[tag] >= (1.0 - FLAT) * largest)
    if len(faces) == 1:
        return taken, [], []
    others = [
        f"{'planar' if tag in plane else 'curved'} face {number} of area "
        f"{areas[tag] * (ARRIVING / unit.size) ** 2:.6g} {unit.symbol}2: another face"
        for number, tag in enumerate(faces, start=1)
        if tag != taken
    ]
    note = (
        f"face {faces.index(taken) + 1} of {len(faces)} taken, the largest planar one"
    )
    return taken, [note], others


def _boundary(gmsh: Any, face: int) -> list[int]:
    """Curves that bound a face."""
    _, loops = gmsh.model.occ.getCurveLoops(face)
    return [abs(int(tag)) for loop in loops for tag in loop]


def _edge(gmsh: Any, tag: int) -> tuple[str, Floats]:
    """Kind of a curve, and points (n, 3) that it is known by; see `_arcs`."""
    kind = str(gmsh.model.getType(1, tag))
    low, high = (
        float(bound[0]) for bound in gmsh.model.getParametrizationBounds(1, tag)
    )
    frame, points = _samples(gmsh, tag, np.linspace(low, high, 4 * SPANS + 1))
    if kind == "Line":
        return kind, points[[0, -1]]
    # Of any kind, such as an ellipse of equal axes.
    if _round((points - frame[0]) @ frame[1:3].T):
        return "Circle", points[::SPANS]
    return "Curve", _curve(gmsh, tag, (low, high))


def _round(points: Floats) -> bool:
    """Whether points (n, 2) along a curve lie on one circle."""
    n = len(points)
    bulge = curves.through(points[0], points[n // 4], points[n // 2])
    if abs(bulge) <= FLAT:
        return False
    one = curves.circles(points[:1], points[n // 2][None], np.array([bulge]))[0]
    off = np.hypot(*(points - one[:2]).T) - one[2]
    return bool(np.abs(off).max() <= ROUND * one[2])


def _curve(gmsh: Any, tag: int, bounds: tuple[float, float]) -> Floats:
    """Starts, tops and ends of the arcs along any other curve, in a row, (3 n, 3)."""
    low, high = bounds
    frame, _ = _samples(gmsh, tag, np.linspace(low, high, 4 * SPANS + 1))

    def curve(t: Floats) -> tuple[Floats, Floats]:
        points = np.reshape(gmsh.model.getValue(1, tag, t.tolist()), (-1, 3))
        along = np.reshape(gmsh.model.getDerivative(1, tag, t.tolist()), (-1, 3))
        return (points - frame[0]) @ frame[1:3].T, along @ frame[1:3].T

    rows = []
    for start, end, bulge in as_arcs(curve, np.linspace(low, high, SPANS + 1)):
        a, b = np.array([start]), np.array([end])
        top = curves.points_at(a, b, np.array([bulge]), np.array([0.5]))[0]
        rows += [start, tuple(top), end]
    return frame[0] + np.array(rows) @ frame[1:3]


def _samples(gmsh: Any, tag: int, parameters: Floats) -> tuple[Floats, Floats]:
    """Origin and two directions of a curve's plane, (3, 3), and points (n, 3) of it."""
    points = np.reshape(gmsh.model.getValue(1, tag, parameters.tolist()), (-1, 3))
    origin = points.mean(axis=0)
    directions = np.linalg.svd(points - origin)[2]
    return np.vstack([origin, directions[:2]]), points


def _level(edges: Sequence[tuple[str, Floats]]) -> bool:
    """Whether a face is parallel to the xy plane."""
    points = np.concatenate([points for _, points in edges])
    size = float(np.ptp(points, axis=0).max())
    return bool(np.ptp(points[:, 2]) <= FLAT * size)


def _turned(edges: Sequence[tuple[str, Floats]]) -> list[tuple[str, Floats]]:
    """Turn a face into the xy plane, its longest straight edge along x."""
    points = np.concatenate([points for _, points in edges])
    centre = points.mean(axis=0)
    normal = np.linalg.svd(points - centre, full_matrices=False)[2][2]
    # Seen from above; an upright face from where x, or else y, is larger.
    leading = next(c for c in normal[::-1] if abs(c) > FLAT)
    normal = normal * math.copysign(1.0, leading)
    x = _direction(edges, normal)
    y = np.cross(normal, x)
    turned = [
        (kind, np.column_stack([(own - centre) @ x, (own - centre) @ y]))
        for kind, own in edges
    ]
    if _above(turned):
        turned = [(kind, -own) for kind, own in turned]
    low = np.concatenate([_outer(kind, own) for kind, own in turned]).min(axis=0)
    return [(kind, own - low) for kind, own in turned]


def _direction(edges: Sequence[tuple[str, Floats]], normal: Floats) -> Floats:
    """Direction of the longest straight edge; a level one where there is none."""
    steps = [points[-1] - points[0] for kind, points in edges if kind == "Line"]
    if steps:
        lengths = np.array([float(np.linalg.norm(step)) for step in steps])
        longest = steps[int(np.argmax(lengths >= (1.0 - FLAT) * lengths.max()))]
        return longest / np.linalg.norm(longest)
    level = np.cross([0.0, 0.0, 1.0], normal)
    if np.linalg.norm(level) <= FLAT:
        return np.array([1.0, 0.0, 0.0])
    return level / np.linalg.norm(level)


def _above(edges: Sequence[tuple[str, Floats]]) -> bool:
    """Whether the longest straight edge, which lies along x, has the face below it."""
    lines = [points for kind, points in edges if kind == "Line"]
    if not lines:
        return False
    lengths = np.array([abs(points[-1, 0] - points[0, 0]) for points in lines])
    longest = lines[int(np.argmax(lengths >= (1.0 - FLAT) * lengths.max()))]
    every = np.concatenate([points[:, 1] for _, points in edges])
    middle = 0.5 * (every.min() + every.max())
    return bool(longest[:, 1].mean() > middle)


def _outer(kind: str, points: Floats) -> Floats:
    """Points that span the box of an edge."""
    arcs = _arcs(kind, points)
    starts = np.array([start for start, _, _ in arcs])
    ends = np.array([end for _, end, _ in arcs])
    bulges = np.array([bulge for _, _, bulge in arcs])
    return np.vstack([curves.outermost(starts, ends, bulges), ends])


def _arcs(kind: str, points: Floats) -> list[Arc]:
    """Lines and arcs of an edge.

    A line is known by its ends, an arc by five points evenly along it, other curves by
    start, top and end of the arcs that follow them.
    """
    if kind == "Line":
        return [(_pair(points[0]), _pair(points[-1]), 0.0)]
    if kind == "Circle":
        half = abs(curves.through(*points[[0, 2, 4]])) <= 1.0 + FLAT
        closed = math.dist(points[0], points[4]) <= FLAT * math.dist(
            points[0], points[2]
        )
        if half and not closed:
            points = points[[0, 2, 4]]
        else:
            end = points[0] if closed else points[4]
            points = np.vstack([points[0:3], points[2:4], end])
    return [
        (_pair(a), _pair(c), curves.through(a, b, c))
        for a, b, c in points.reshape(-1, 3, 2)
    ]


def _pair(point: Floats) -> tuple[float, float]:
    return float(point[0]), float(point[1])
