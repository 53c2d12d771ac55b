"""Triangles from an outline, by Gmsh.

Gmsh is started without its signal handler, works in a model of its own that is removed
again, and gets its options back; what it returns is checked, since it reports neither
cracks nor holes it lost. Two meshes are never made at once in one process, which Gmsh
does not survive.
"""

import math
import threading
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from typing import Any

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.errors import InputError, MeshError
from kplate.mesh import STRAIGHT_EDGE, Mesh
from kplate.outline import Circle, ClosedLine, Outline

# A coarser circle has chords that turn by more than 7.5 degrees and lose 0.3 % of w.
EDGES_ON_CIRCLE = 48
# Frontal-Delaunay: the best smallest angle at the speed of the fastest.
FRONTAL = 6
GROWTH = 0.35  # of the edges with the distance from a refined place
LARGEST = 5_000_000  # triangles; beyond, 24 GiB of memory do not hold the factor

_OPTIONS = {
    "General.Verbosity": 0.0,
    "Mesh.Algorithm": float(FRONTAL),
    "Mesh.ElementOrder": 1.0,
    "Mesh.MaxNumThreads1D": 1.0,  # with more the points come in another order
    "Mesh.MeshSizeExtendFromBoundary": 0.0,
    "Mesh.MeshSizeFromPoints": 1.0,
    "Mesh.MeshSizeFromCurvature": 0.0,
    "Mesh.MeshSizeFactor": 1.0,
    "Mesh.MeshSizeMin": 0.0,
    "Mesh.MinimumCircleNodes": 7.0,
    "Mesh.RecombineAll": 0.0,
    "Mesh.Smoothing": 1.0,
    "Mesh.SubdivisionAlgorithm": 0.0,
}
_LOCK = threading.Lock()


def size_for(outline: Outline, triangles: int) -> float:
    """Edge length in m at which a mesh has about this many triangles.

    Raises
    ------
    InputError
        If the number is not between 4 and 5 million.
    """
    if not 4 <= triangles <= LARGEST:
        raise InputError(
            f"triangles = {triangles}; ask for a number between 4 and {LARGEST}."
        )
    return math.sqrt(4.0 / math.sqrt(3.0) * outline.area / triangles)


def refined_triangles(ratio: float) -> float:
    """About how many triangles a place takes whose edges are finer by this ratio.

    The integral of triangles per area, ``4 / (sqrt(3) s^2)``, over the whole disc on
    which the size s grows from the least to the mesh's own.
    """
    if ratio <= 1.0:
        return 0.0
    whole = 8.0 * math.pi / math.sqrt(3.0) / GROWTH**2
    return whole * (math.log(ratio) + 1.0 / ratio - 1.0)


def mesh_outline(
    outline: Outline,
    *,
    size: float,
    fine: Sequence[tuple[tuple[float, float], float]] = (),
) -> Mesh:
    """Mesh an outline with triangles of one size, finer around some places.

    Parameters
    ----------
    outline : Outline
        What to mesh.
    size : float
        Length of the edges in m; shorter on circles, which get 48 edges at least.
    fine : sequence of (place, size)
        Places in m and the length of the edges there; it grows with the distance.

    Returns
    -------
    Mesh
        Rim points lie on the true circle, every boundary edge on one side.

    Raises
    ------
    InputError
        If the size is not positive or so small that the mesh would pass 5 million
        triangles, or a fine place lacks finite coordinates or a positive size.
    MeshError
        If Gmsh fails or its mesh does not fit the outline.
    """
    least = size_for(outline, LARGEST)
    if not (math.isfinite(size) and size >= least):
        raise InputError(
            f"the mesh size is {size:g} m; it must be finite and at least {least:.3g} "
            "m for this outline."
        )
    _check_fine(fine)
    with _LOCK, _gmsh_model(size) as gmsh:
        curves = [_add_line(gmsh, line, size) for line in outline.lines]
        loops = [gmsh.model.occ.addCurveLoop(tags) for tags in curves]
        gmsh.model.occ.addPlaneSurface(loops)
        gmsh.model.occ.synchronize()
        for line, tags in zip(outline.lines, curves, strict=True):
            if isinstance(line, Circle):
                ends = gmsh.model.getBoundary([(1, tags[0])], combined=False)
                gmsh.model.mesh.setSize(ends, line.perimeter / EDGES_ON_CIRCLE)
        _refine(gmsh, size, fine)
        try:
            gmsh.model.mesh.generate(2)
        except Exception as error:
            raise MeshError(
                f"the outline could not be meshed at size {size:g} m ({error}); try "
                "another size."
            ) from error
        mesh = _read(gmsh, outline, curves)
    _check_area(mesh, outline)
    return mesh


@contextmanager
def _gmsh_model(size: float) -> Iterator[Any]:
    """A model of our own inside Gmsh; everything is put back afterwards."""
    gmsh = _import_gmsh()
    started = not gmsh.isInitialized()
    if started:
        gmsh.initialize(
            ["kplate", "-v", "0"], readConfigFiles=False, run=False, interruptible=False
        )
    before = gmsh.model.getCurrent() if gmsh.model.list() else None
    options = {**_OPTIONS, "Mesh.MeshSizeMax": size}
    saved = {name: gmsh.option.getNumber(name) for name in options}
    name = "kplate"
    while name in gmsh.model.list():
        name += "_"
    try:
        for key, value in options.items():
            gmsh.option.setNumber(key, value)
        gmsh.model.add(name)
        yield gmsh
    finally:
        gmsh.model.setCurrent(name)
        gmsh.model.remove()
        for key, value in saved.items():
            gmsh.option.setNumber(key, value)
        if before is not None:
            gmsh.model.setCurrent(before)
        if started:
            gmsh.finalize()


def _import_gmsh() -> Any:
    try:
        import gmsh
    except OSError as error:
        raise MeshError(
            f"Gmsh cannot start: {error}. Install the system libraries that the README "
            "lists (on Debian: libglu1-mesa libgl1 libxcursor1 libxft2 libxinerama1 "
            "libgomp1)."
        ) from error
    return gmsh


def _check_fine(fine: Sequence[tuple[tuple[float, float], float]]) -> None:
    for (x, y), least in fine:
        if not (all(map(math.isfinite, (x, y, least))) and least > 0.0):
            raise InputError(
                f"the mesh size is {least:g} m at ({x:.6g}, {y:.6g}) m; it must be a "
                "positive number, at a place with finite coordinates."
            )


def _add_line(gmsh: Any, line: ClosedLine, size: float) -> list[int]:
    """Add a closed line; return the tag of the curve of each side piece, in order."""
    occ = gmsh.model.occ
    if isinstance(line, Circle):
        return [occ.addCircle(*line.centre, 0.0, line.radius)]
    points = [occ.addPoint(x, y, 0.0, size) for x, y in line.points]
    ends = points[1:] + points[:1]
    return [occ.addLine(a, b) for a, b in zip(points, ends, strict=True)]


def _refine(
    gmsh: Any, size: float, fine: Sequence[tuple[tuple[float, float], float]]
) -> None:
    """Ask for smaller edges around some places, by the smallest of a field for each."""
    field = gmsh.model.mesh.field
    balls = []
    for (x, y), least in fine:
        if least < size:
            ball = field.add("Ball")
            for key, value in {
                "XCenter": x,
                "YCenter": y,
                "Radius": least,
                "VIn": least,
                "VOut": size,
                "Thickness": (size - least) / GROWTH,
            }.items():
                field.setNumber(ball, key, value)
            balls.append(ball)
    if balls:
        smallest = field.add("Min")
        field.setNumbers(smallest, "FieldsList", balls)
        field.setAsBackgroundMesh(smallest)


def _read(gmsh: Any, outline: Outline, curves: list[list[int]]) -> Mesh:
    """Take the mesh out of Gmsh, without the points that no triangle uses."""
    tags, coordinates, _ = gmsh.model.mesh.getNodes()
    corners = gmsh.model.mesh.getElementsByType(2)[1].astype(np.int64)
    if not corners.size:
        raise MeshError("the outline could not be meshed: no triangles came out.")
    used = np.unique(corners)
    number = np.full(int(tags.max()) + 1, -1)
    number[used] = np.arange(len(used))
    place = np.zeros((len(number), 2))
    place[tags.astype(np.int64)] = coordinates.reshape(-1, 3)[:, :2]
    names = outline.side_names
    edges, sides, circles = [], [], []
    round_lines = [line for line in outline.lines if isinstance(line, Circle)]
    for line, line_curves in zip(outline.lines, curves, strict=True):
        circle = round_lines.index(line) if line in round_lines else STRAIGHT_EDGE
        for side, curve in zip(line.sides, line_curves, strict=True):
            pairs = gmsh.model.mesh.getElementsByType(1, curve)[1].astype(np.int64)
            if not np.isin(pairs, used).all():
                raise MeshError(
                    f"the triangles leave side {side!r} out; try another size."
                )
            edges.append(number[pairs].reshape(-1, 2))
            sides.append(np.full(len(edges[-1]), names.index(side)))
            circles.append(np.full(len(edges[-1]), circle))
    triangles = number[corners].reshape(-1, 3)
    points = place[used]
    return Mesh(
        points=points,
        triangles=triangles,
        boundary_edges=_plate_on_left(triangles, np.vstack(edges)),
        boundary_sides=np.concatenate(sides),
        side_names=names,
        boundary_circles=np.concatenate(circles),
        circles=np.array([(*c.centre, c.radius) for c in round_lines]).reshape(-1, 3),
    )


def _plate_on_left(triangles: Ints, edges: Ints) -> Ints:
    """Turn boundary edges round that do not run as their triangle does."""
    n = int(triangles.max()) + 1
    around = triangles[:, [[0, 1], [1, 2], [2, 0]]].reshape(-1, 2)
    forward = np.isin(edges[:, 0] * n + edges[:, 1], around[:, 0] * n + around[:, 1])
    return np.where(forward[:, None], edges, edges[:, ::-1])


def _check_area(mesh: Mesh, outline: Outline) -> None:
    """Compare with the outline's area, the slivers behind chords allowed for."""
    expected = outline.area
    curved = mesh.boundary_circles != STRAIGHT_EDGE
    radius = mesh.circles[mesh.boundary_circles[curved], 2]
    sign = _circle_signs(outline)[mesh.boundary_circles[curved]]
    expected -= float(np.sum(sign * _sliver(radius, mesh.boundary_lengths[curved])))
    if abs(mesh.area - expected) > 1e-9 * outline.size**2:
        raise MeshError(
            f"the mesh covers {mesh.area:.9g} m2 of an outline of {expected:.9g} m2; "
            "please report the outline."
        )


def _circle_signs(outline: Outline) -> Floats:
    """+1 where the chords of a circle cut plate off (a rim), -1 on a hole."""
    return np.array(
        [
            1.0 if line is outline.rim else -1.0
            for line in outline.lines
            if isinstance(line, Circle)
        ]
    )


def _sliver(radius: Floats, chord: Floats) -> Floats:
    """Area between a circle and its chord in m2."""
    angle = 2.0 * np.arcsin(np.minimum(0.5 * chord / radius, 1.0))
    return 0.5 * radius**2 * (angle - np.sin(angle))
