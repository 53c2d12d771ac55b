"""Triangles from an outline, by Gmsh.

Gmsh is started without its signal handler, works in a model of its own that is removed
again, and gets its options back; what it returns is checked, since it reports neither
cracks nor holes it lost. Two meshes are never made at once in one process, which Gmsh
does not survive. The plate, its zones, seams and marks are fragmented into one
conforming model; which side a boundary curve belongs to is read off its middle point.
"""

import itertools
import math
import threading
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any

import numpy as np

from kplate import curves
from kplate.arrays import Floats, Ints
from kplate.errors import InputError, MeshError
from kplate.mesh import STRAIGHT_EDGE, Mesh
from kplate.outline import Outline
from kplate.polygon import SNAP, Polygon, at
from kplate.sizefields import GROWTH, WITHIN, grade

# With 48 the stress at a bore comes out 5 % low, with 96 2 %; a plate of many holes
# gets 48, or nearly all its triangles would stand around them.
EDGES_ON_CIRCLE, EDGES_ON_MANY = 96, 48
FEW_HOLES = 12
# Frontal-Delaunay: the best smallest angle at the speed of the fastest.
FRONTAL = 6
LARGEST = 5_000_000  # triangles; beyond, 24 GiB of memory do not hold the factor
# An arc of more is parted, since a circle is given by its centre and two points.
MOST_SWEEP = 0.9 * math.pi

_OPTIONS = {
    "General.Verbosity": 0.0,
    "Mesh.Algorithm": float(FRONTAL),
    "Mesh.ElementOrder": 1.0,
    "Mesh.MaxNumThreads1D": 1.0,  # with more the points come in another order
    # Sizes come from one field alone: taken on from the boundary as well, they fill
    # the inside of an outline of many refined corners with the smallest.
    "Mesh.MeshSizeExtendFromBoundary": 0.0,
    "Mesh.MeshSizeFromPoints": 0.0,
    "Mesh.MeshSizeFromCurvature": 0.0,
    "Mesh.MeshSizeFactor": 1.0,
    "Mesh.MeshSizeMin": 0.0,
    "Mesh.MinimumCircleNodes": 7.0,
    "Mesh.RecombineAll": 0.0,
    "Mesh.Smoothing": 1.0,
    "Mesh.SubdivisionAlgorithm": 0.0,
}
_LOCK = threading.Lock()

Place = tuple[float, float]


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

    The integral of triangles per area, ``4 / (sqrt(3) s^2)``, over the disc of the
    least size s and the ring on which it grows to the mesh's own.
    """
    if ratio <= 1.0:
        return 0.0
    start = WITHIN - 1.0 / GROWTH  # of the ring, from where the size would vanish
    ring = math.log(ratio) / GROWTH**2 + start / GROWTH * (1.0 - 1.0 / ratio)
    return 8.0 * math.pi / math.sqrt(3.0) * (0.5 * WITHIN**2 + ring)


def mesh_outline(
    outline: Outline,
    *,
    size: float,
    fine: Sequence[tuple[Place, float]] = (),
    graded: Sequence[tuple[Place, float]] = (),
    around: int | None = None,
) -> Mesh:
    """Mesh an outline with triangles of one size, finer around some places.

    Parameters
    ----------
    outline : Outline
        What to mesh.
    size : float
        Length of the edges in m; shorter on arcs, see `around`.
    fine : sequence of (place, size)
        Places in m and the length of the edges around them, as far as twelve edges
        reach; from there it grows with the distance.
    graded : sequence of (place, size)
        Places from which the length grows at once.
    around : int, optional
        Least number of edges on a full round rim; 96 if left out, 48 where there are
        more than twelve holes, as chords need that stand for arcs. Circles inside the
        plate, of zones and seams, have as many in any case.

    Returns
    -------
    Mesh
        Points of arcs lie on the true circle, every boundary edge on one side; zones,
        seams and marks are parts of it.

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
    _check_fine([*fine, *graded])
    with gmsh_model(size) as gmsh:
        try:
            model = _build(gmsh, outline)
            few = len(outline.holes) <= FEW_HOLES
            chords = EDGES_ON_CIRCLE if few else EDGES_ON_MANY
            discs = [(*place, WITHIN) for place in fine]
            discs += [(*place, 1.0) for place in graded]
            grade(gmsh, size, discs, (around or chords, chords))
            gmsh.model.mesh.generate(2)
        except Exception as error:
            raise MeshError(
                f"the outline could not be meshed at size {size:g} m ({error}); try "
                "another size."
            ) from error
        mesh = _read(gmsh, outline, model)
    _check_area(mesh, outline)
    return mesh


@contextmanager
def gmsh_model(size: float) -> Iterator[Any]:
    """A model of our own inside Gmsh, one at a time; all is put back afterwards."""
    gmsh = _import_gmsh()
    with _LOCK, _own_model(gmsh, size):
        yield gmsh


@contextmanager
def _own_model(gmsh: Any, size: float) -> Iterator[None]:
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
        yield
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


def _check_fine(fine: Sequence[tuple[Place, float]]) -> None:
    for (x, y), least in fine:
        if not (all(map(math.isfinite, (x, y, least))) and least > 0.0):
            raise InputError(
                f"the mesh size is {least:g} m at ({x:.6g}, {y:.6g}) m; it must be a "
                "positive number, at a place with finite coordinates."
            )


@dataclass(frozen=True, kw_only=True)
class _Model:
    """Tags of what was fragmented: surfaces by zone, curves by seam, points by mark."""

    surfaces: list[list[int]]
    seams: list[list[int]]
    marks: list[list[int]]


def _build(gmsh: Any, outline: Outline) -> _Model:
    """Make the geometry; number 0 of the surfaces is the plate outside all zones."""
    occ = gmsh.model.occ
    loops = [_add_loop(occ, line) for line in outline.boundaries]
    plate = [(2, occ.addPlaneSurface(loops))]
    zones = [
        [(2, occ.addPlaneSurface([_add_loop(occ, zone.shape.line)]))]
        for zone in outline.zones
    ]
    seams = [
        [(1, tag) for tag in _add_pieces(occ, seam.points, seam.bulges, closed=False)]
        for seam in outline.seams
    ]
    marks = [[(0, occ.addPoint(*mark.at, 0.0))] for mark in outline.marks]
    tools = [*zones, *seams, *marks]
    flat = [entity for group in tools for entity in group]
    if not flat:
        occ.synchronize()
        return _Model(surfaces=[[plate[0][1]]], seams=[], marks=[])
    _, images = occ.fragment(plate, flat)
    occ.synchronize()
    inside = {tag for _, tag in images[0]}
    groups, first = [], 1
    for group in tools:
        last = first + len(group)
        groups.append([t for image in images[first:last] for _, t in image])
        first = last
    n, m = len(zones), len(zones) + len(seams)
    own = [[tag for tag in group if tag in inside] for group in groups[:n]]
    rest = sorted(inside - {tag for group in own for tag in group})
    _drop_outside(gmsh, inside)
    return _Model(surfaces=[rest, *own], seams=groups[n:m], marks=groups[m:])


def _drop_outside(gmsh: Any, inside: set[int]) -> None:
    """Remove surfaces of zones that lie in holes."""
    extra = [(2, tag) for _, tag in gmsh.model.getEntities(2) if tag not in inside]
    if extra:
        gmsh.model.occ.remove(extra, recursive=True)
        gmsh.model.occ.synchronize()


def _add_loop(occ: Any, line: Polygon) -> int:
    return int(
        occ.addCurveLoop(_add_pieces(occ, line.points, line.bulges, closed=True))
    )


def _add_pieces(occ: Any, points: Floats, bulges: Floats, *, closed: bool) -> list[int]:
    """Add lines and arcs through points; return their tags in order."""
    tags = [occ.addPoint(x, y, 0.0) for x, y in points]
    starts = points if closed else points[:-1]
    ends = np.roll(points, -1, axis=0) if closed else points[1:]
    circles = curves.circles(starts, ends, bulges)
    made: list[int] = []
    for i in range(len(starts)):
        first, last = tags[i], tags[(i + 1) % len(tags)]
        if bulges[i] == 0.0:
            made.append(occ.addLine(first, last))
            continue
        parts = math.ceil(4.0 * abs(math.atan(bulges[i])) / MOST_SWEEP)
        share = np.arange(1, parts) / parts
        one = slice(i, i + 1)
        between = [
            curves.points_at(starts[one], ends[one], bulges[one], np.array([s]))[0]
            for s in share
        ]
        middle = [occ.addPoint(x, y, 0.0) for x, y in between]
        centre = occ.addPoint(*circles[i, :2], 0.0)
        stops = [first, *middle, last]
        made += [occ.addCircleArc(a, centre, b) for a, b in itertools.pairwise(stops)]
    return made


def _read(gmsh: Any, outline: Outline, model: _Model) -> Mesh:
    """Take the mesh out of Gmsh, without the points that no triangle uses."""
    tags, coordinates, _ = gmsh.model.mesh.getNodes()
    groups = [
        np.concatenate([_triangles(gmsh, tag) for tag in surfaces] or [_NONE])
        for surfaces in model.surfaces
    ]
    corners = np.concatenate(groups)
    if not len(corners):
        raise MeshError("the outline could not be meshed: no triangles came out.")
    zones = np.repeat(np.arange(len(groups)), [len(group) for group in groups])
    used = np.unique(corners)
    number = np.full(int(tags.max()) + 1, -1)
    number[used] = np.arange(len(used))
    place = np.zeros((len(number), 2))
    place[tags.astype(np.int64)] = coordinates.reshape(-1, 3)[:, :2]
    triangles, points = number[corners], place[used]
    edges, sides, circles, table = _boundary(gmsh, outline, number)
    seams = [_edges(gmsh, curve, number) for group in model.seams for curve in group]
    counts = [sum(len(_edges(gmsh, c, number)) for c in group) for group in model.seams]
    marks = [
        int(number[int(gmsh.model.mesh.getNodes(0, group[0])[0][0])])
        for group in model.marks
    ]
    return Mesh(
        points=points,
        triangles=triangles,
        boundary_edges=_plate_on_left(triangles, edges),
        boundary_sides=sides,
        side_names=outline.side_names,
        boundary_circles=circles,
        circles=table,
        zones=zones,
        zone_names=("plate", *outline.zone_names),
        seam_edges=np.concatenate([*seams, np.empty((0, 2), dtype=np.int64)]),
        seam_numbers=np.repeat(np.arange(len(counts)), counts),
        seam_names=tuple(seam.name for seam in outline.seams),
        mark_vertices=np.array(marks, dtype=np.int64),
        mark_names=tuple(mark.name for mark in outline.marks),
    )


_NONE = np.empty((0, 3), dtype=np.int64)


def _triangles(gmsh: Any, surface: int) -> Ints:
    corners = gmsh.model.mesh.getElementsByType(2, surface)[1]
    return np.asarray(corners, dtype=np.int64).reshape(-1, 3)


def _edges(gmsh: Any, curve: int, number: Ints) -> Ints:
    pairs = gmsh.model.mesh.getElementsByType(1, curve)[1].astype(np.int64)
    edges: Ints = number[pairs].reshape(-1, 2)
    return edges


def _boundary(
    gmsh: Any, outline: Outline, number: Ints
) -> tuple[Ints, Ints, Ints, Floats]:
    """Boundary edges with their sides and circles, and the table of circles."""
    surfaces = gmsh.model.getEntities(2)
    lines = gmsh.model.getBoundary(surfaces, combined=True, oriented=False)
    pieces = outline.boundaries
    starts = np.concatenate([line.points for line in pieces])
    ends = np.concatenate([line.ends for line in pieces])
    bulges = np.concatenate([line.bulges for line in pieces])
    middles = np.array([_middle(gmsh, curve) for _, curve in lines])
    off = curves.distances(middles, starts, ends, bulges)
    nearest = off.argmin(axis=1)
    for i in np.flatnonzero(off.min(axis=1) > SNAP * outline.size):
        raise MeshError(
            f"a boundary curve near {at(middles[i])} lies on no side; please report "
            "the outline."
        )
    order = outline.side_names
    names = [name for line in pieces for name in line.sides]
    lost = set(order) - {names[piece] for piece in nearest}
    for name in sorted(lost):
        raise MeshError(f"the triangles leave side {name!r} out; try another size.")
    edges = [_edges(gmsh, curve, number) for _, curve in lines]
    owners = np.repeat(nearest, [len(own) for own in edges])
    bent = bulges != 0.0
    rounds = np.where(bent, np.cumsum(bent) - 1, STRAIGHT_EDGE)
    sides = np.array([order.index(name) for name in names])
    table = curves.circles(starts, ends, bulges)[bent]
    return np.concatenate(edges), sides[owners], rounds[owners], table


def _middle(gmsh: Any, curve: int) -> list[float]:
    low, high = gmsh.model.getParametrizationBounds(1, curve)
    return list(gmsh.model.getValue(1, curve, [0.5 * (low[0] + high[0])])[:2])


def _plate_on_left(triangles: Ints, edges: Ints) -> Ints:
    """Turn boundary edges round that do not run as their triangle does."""
    n = int(triangles.max()) + 1
    around = triangles[:, [[0, 1], [1, 2], [2, 0]]].reshape(-1, 2)
    forward = np.isin(edges[:, 0] * n + edges[:, 1], around[:, 0] * n + around[:, 1])
    return np.where(forward[:, None], edges, edges[:, ::-1])


def _check_area(mesh: Mesh, outline: Outline) -> None:
    """Compare with the outline's area, the slivers behind chords allowed for."""
    curved = mesh.boundary_circles != STRAIGHT_EDGE
    x, y, radius = mesh.circles[mesh.boundary_circles[curved]].T
    start, end = np.moveaxis(mesh.points[mesh.boundary_edges[curved]], 1, 0)
    # The centre lies on the plate's side of the chord where the arc bulges outwards.
    step, arm = end - start, np.column_stack([x, y]) - start
    sign = np.sign(step[:, 0] * arm[:, 1] - step[:, 1] * arm[:, 0])
    slivers = _sliver(radius, mesh.boundary_lengths[curved])
    expected = outline.area - float(np.sum(sign * slivers))
    if abs(mesh.area - expected) > 1e-9 * outline.size**2:
        raise MeshError(
            f"the mesh covers {mesh.area:.9g} m2 of an outline of {expected:.9g} m2; "
            "please report the outline."
        )


def _sliver(radius: Floats, chord: Floats) -> Floats:
    """Area between a circle and its chord in m2."""
    angle = 2.0 * np.arcsin(np.minimum(0.5 * chord / radius, 1.0))
    return 0.5 * radius**2 * (angle - np.sin(angle))
