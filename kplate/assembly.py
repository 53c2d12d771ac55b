"""Sparse stiffness and load vectors from elements.

Triangles go through in blocks, which stay in the processor's cache and bound the
memory. The pattern of the matrix follows from the vertices and edges of the mesh once;
its numbers are then summed by one count over a stored index.
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp

from kplate import cutting
from kplate.arrays import Floats, Ints
from kplate.boundary import Constraints
from kplate.dofs import Numbering
from kplate.elements import Element
from kplate.elements.triangle import Geometry
from kplate.errors import InputError
from kplate.loads import (
    DiscPatch,
    EdgeMoment,
    Hydrostatic,
    LineForce,
    Load,
    PointForce,
    PointMoment,
    Pressure,
    PressureField,
    RectanglePatch,
    SelfWeight,
)
from kplate.mesh import Mesh
from kplate.plate import Plate
from kplate.quadrature import gauss

BLOCK = 1024  # triangles; 512 to 2048 are about equally fast
# Share of a patch that may be missing, as round-off, before it is off the plate.
MISSING = 1e-9


def stiffness(plate: Plate, element: Element, constraints: Constraints) -> sp.csc_array:
    """Lower triangle of the stiffness of the free unknowns.

    Parameters
    ----------
    plate : Plate
        Gives the rigidity.
    element : Element
        With unknowns at the vertices only.
    constraints : Constraints
        Frames of the turned unknowns, and which are held.

    Returns
    -------
    csc_array, shape (n_free, n_free)
        Rows sorted, diagonal included.
    """
    mesh = constraints.numbering.mesh
    frame_of = np.full(len(mesh.points), -1)
    frame_of[constraints.vertices] = np.arange(len(constraints.vertices))
    pattern = Pattern.of(mesh, element.per_vertex)
    blocks = np.empty((len(mesh.triangles), 6, element.per_vertex**2))
    for block, K in element_stiffness(plate, mesh, element):
        _turn(K, frame_of[mesh.triangles[block]], constraints.frames)
        blocks[block] = pattern.pairs(K, mesh.triangles[block])
    return pattern.matrix(blocks, constraints.free)


def element_stiffness(
    plate: Plate, mesh: Mesh, element: Element, triangles: Ints | None = None
) -> Iterator[tuple[Ints, Floats]]:
    """Element stiffness matrices, block by block.

    Yields
    ------
    triangles : ndarray, shape (n,)
        Their numbers.
    K : ndarray, shape (n, d, d)
        Their matrices.
    """
    q = len(element.rule.weights)
    chosen = np.arange(len(mesh.triangles)) if triangles is None else triangles
    for start in range(0, len(chosen), BLOCK):
        block = chosen[start : start + BLOCK]
        geometry = Geometry(
            vertices=mesh.points[mesh.triangles[block]], rule=element.rule
        )
        own = plate.rigidities[mesh.zones[block]]
        rigidity = np.broadcast_to(own[:, None], (len(block), q, 3, 3))
        yield block, element.stiffness(geometry, rigidity)


def internal_forces(
    plate: Plate,
    element: Element,
    numbering: Numbering,
    unknowns: Floats,
    triangles: Ints | None = None,
) -> Floats:
    """Stiffness times unknowns (count, c), summed over some triangles or all.

    Each triangle's rigid motion, which brings no forces, is taken off first: where
    triangles are small its round-off would be larger than the forces themselves.
    """
    mesh = numbering.mesh
    result = np.zeros_like(unknowns)
    for block, K in element_stiffness(plate, mesh, element, triangles):
        table = numbering.table[block]
        vertices = mesh.points[mesh.triangles[block]]
        bent = without_rigid_motion(unknowns[table], vertices, numbering.per_vertex)
        _add(result, table, K @ bent)
    return result


def load_vector(
    plate: Plate, element: Element, numbering: Numbering, loads: Sequence[Load]
) -> Floats:
    """Consistent forces on all unknowns, (count,).

    Raises
    ------
    InputError
        If a patch or point force is not on the plate, a self-weight has no density, or
        a pressure function does not return finite numbers of the right shape.
    """
    forces = np.zeros((numbering.count, 1))
    for load in loads:
        match load:
            case RectanglePatch() | DiscPatch():
                _add_patch(forces, element, numbering, load)
            case PointForce() | PointMoment():
                _add_point(forces, element, numbering, load)
            case LineForce() | EdgeMoment():
                _add_line(forces, element, numbering, load)
            case _:
                _add_pressure(forces, element, numbering, plate, load)
    return forces[:, 0]


@dataclass(frozen=True, eq=False, kw_only=True)
class Pattern:
    """Where the entries of the lower triangle stand.

    Blocks of p x p numbers, one for each vertex and then one for each edge, hold the
    rows of the smaller vertex number and the columns of the larger.

    Parameters
    ----------
    mesh : Mesh
        The triangles.
    p : int
        Unknowns at each vertex.
    index : ndarray, shape (n_triangles, 6)
        Block of each pair of vertices of a triangle: (0, 0), (1, 1), (2, 2), then the
        pairs opposite vertices 0, 1, 2.
    """

    mesh: Mesh
    p: int
    index: Ints

    @classmethod
    def of(cls, mesh: Mesh, p: int) -> "Pattern":
        """Pattern of a mesh with p unknowns at each vertex."""
        edges = len(mesh.points) + mesh.triangle_edges
        return cls(mesh=mesh, p=p, index=np.hstack([mesh.triangles, edges]))

    def pairs(self, K: Floats, triangles: Ints) -> Floats:
        """Cut element matrices (n, 3p, 3p) into the six blocks of each, (n, 6, p p)."""
        n, p = len(K), self.p
        parted = K.reshape(n, 3, p, 3, p)
        blocks = np.empty((n, 6, p, p))
        for k, (i, j) in enumerate(((1, 2), (2, 0), (0, 1))):
            blocks[:, k] = parted[:, k, :, k]
            rising = (triangles[:, i] < triangles[:, j])[:, None, None]
            blocks[:, 3 + k] = np.where(rising, parted[:, i, :, j], parted[:, j, :, i])
        return blocks.reshape(n, 6, p * p)

    def matrix(self, blocks: Floats, free: np.ndarray) -> sp.csc_array:
        """Sum blocks (n_triangles, 6, p p) and keep the free unknowns."""
        n_points, n_edges, p = len(self.mesh.points), len(self.mesh.edges), self.p
        entry = (p * p) * self.index[:, :, None] + np.arange(p * p)
        count = (n_points + n_edges) * p * p
        numbers = np.bincount(entry.ravel(), blocks.ravel(), minlength=count)
        # Block row v: the diagonal, then the edges whose smaller vertex is v, in order.
        smaller, larger = self.mesh.edges.T
        starts = np.arange(n_points) + np.searchsorted(smaller, np.arange(n_points))
        order = np.empty(n_points + n_edges, dtype=np.int64)
        order[starts] = np.arange(n_points)
        after = np.arange(n_edges) + smaller + 1
        order[after] = n_points + np.arange(n_edges)
        columns = np.empty(n_points + n_edges, dtype=np.int64)
        columns[starts], columns[after] = np.arange(n_points), larger
        pointers = np.append(starts, n_points + n_edges)
        data = numbers.reshape(-1, p, p)[order]
        upper = sp.bsr_array((data, columns, pointers), shape=(p * n_points,) * 2)
        return _free_lower(upper.tocsr(), free)


def _free_lower(upper: sp.csr_array, free: np.ndarray) -> sp.csc_array:
    """Drop held unknowns; the rows of the upper triangle are columns of the lower."""
    n = upper.shape[0]
    rows = np.repeat(np.arange(n), np.diff(upper.indptr))
    keep = free[rows] & free[upper.indices] & (upper.indices >= rows)
    number = np.cumsum(free) - 1
    counts = np.bincount(rows[keep], minlength=n)[free]
    pointers = np.concatenate([[0], np.cumsum(counts)])
    indices = number[upper.indices[keep]]
    size = int(free.sum())
    return sp.csc_array((upper.data[keep], indices, pointers), shape=(size, size))


def _turn(K: Floats, frame_of: Ints, frames: Floats) -> None:
    """Turn element matrices, in place, where a vertex has a frame."""
    p = frames.shape[-1]
    for k in range(3):
        some = np.flatnonzero(frame_of[:, k] >= 0)
        if some.size:
            Q = frames[frame_of[some, k]]
            own = slice(p * k, p * (k + 1))
            K[some, own] = Q.swapaxes(-1, -2) @ K[some, own]
            K[some, :, own] = K[some, :, own] @ Q


def without_rigid_motion(own: Floats, vertices: Floats, p: int) -> Floats:
    """Take the mean deflection and slope off the vertex unknowns (n, 3 p, c)."""
    parted = own.reshape(len(own), 3, p, -1).copy()
    slope = parted[:, :, 1:3].mean(axis=1)  # (n, 2, c)
    arms = vertices - vertices.mean(axis=1, keepdims=True)
    parted[:, :, 1:3] -= slope[:, None]
    parted[:, :, 0] -= parted[:, :, 0].mean(axis=1, keepdims=True) + arms @ slope
    return parted.reshape(own.shape)


def _add(forces: Floats, table: Ints, own: Floats) -> None:
    """Sum forces (n, d, c) of triangles into those of the unknowns (count, c)."""
    for c in range(forces.shape[1]):
        weights = np.ascontiguousarray(own[:, :, c]).ravel()
        forces[:, c] += np.bincount(table.ravel(), weights, minlength=len(forces))


def _add_pressure(
    forces: Floats, element: Element, numbering: Numbering, plate: Plate, load: Load
) -> None:
    mesh = numbering.mesh
    rule = element.load_rule
    chosen = np.arange(len(mesh.triangles))
    if isinstance(load, Pressure) and load.zone is not None:
        chosen = _zone_triangles(mesh, load.zone)
    if isinstance(load, Hydrostatic):
        chosen = _add_waterline(forces, element, numbering, load)
    for start in range(0, len(chosen), BLOCK):
        block = chosen[start : start + BLOCK]
        vertices = mesh.points[mesh.triangles[block]]
        points = rule.points @ vertices
        pressure = _pressure(load, plate, points, mesh.zones[block])
        own = element.load(Geometry(vertices=vertices, rule=rule), pressure)
        _add(forces, numbering.table[block], own[..., None])


def _pressure(load: Load, plate: Plate, points: Floats, zones: Ints) -> Floats:
    """Pressure in Pa at points (n, q, 2) of triangles in these zones (n,)."""
    match load:
        case Pressure(value=value):
            return np.full(points.shape[:-1], value)
        case SelfWeight(acceleration=acceleration):
            weights = np.array([_mass_per_area(plate, k) for k in np.unique(zones)])
            own = weights[np.searchsorted(np.unique(zones), zones)] * acceleration
            return np.broadcast_to(own[:, None], points.shape[:-1])
        case Hydrostatic():
            depth = _depth(load, points)
            return np.where(depth > 0.0, load.specific_weight * depth, 0.0)
        case PressureField(function=function):
            return _field_pressure(function(points[..., 0], points[..., 1]), points)
    raise AssertionError(load)


def _mass_per_area(plate: Plate, section: int) -> float:
    """Mass per area in kg/m2 of a section."""
    h, material = plate.sections[section]
    if material.density is None:
        raise InputError(
            f"material {material.name!r} states no density; a self-weight needs one."
        )
    return material.density * h


def _zone_triangles(mesh: Mesh, zone: str) -> Ints:
    """Triangles of a zone that a load names."""
    if zone not in mesh.zone_names:
        raise InputError(
            f"a pressure acts on zone {zone!r}; the zones are "
            f"{', '.join(mesh.zone_names[1:]) or 'none'}."
        )
    return np.flatnonzero(mesh.zones == mesh.zone_names.index(zone))


def _field_pressure(value: Floats, points: Floats) -> Floats:
    """Check what a user's function returned."""
    result = np.asarray(value, dtype=float)
    if result.shape not in ((), points.shape[:-1]):
        raise InputError(
            f"a pressure function returned shape {result.shape} for points of shape "
            f"{points.shape[:-1]}; it must return one pressure a point."
        )
    result = np.broadcast_to(result, points.shape[:-1])
    bad = ~np.isfinite(result)
    if bad.any():
        x, y = points[bad][0]
        raise InputError(
            f"a pressure function returned {result[bad][0]} at ({x:.6g}, {y:.6g}) m; "
            "it must be finite all over the plate."
        )
    return result


def _depth(load: Hydrostatic, points: Floats) -> Floats:
    """Depth in m below the liquid's surface."""
    up = np.asarray(load.up, dtype=float)
    return load.level - points @ (up / np.hypot(*up))


def _add_waterline(
    forces: Floats, element: Element, numbering: Numbering, load: Hydrostatic
) -> Ints:
    """Add the triangles that the liquid's surface cuts; return those wholly wet."""
    mesh = numbering.mesh
    depth = _depth(load, mesh.points[mesh.triangles])
    cut = np.flatnonzero((depth.min(axis=1) < 0.0) & (depth.max(axis=1) > 0.0))
    if cut.size:
        up = np.asarray(load.up, dtype=float)
        up /= np.hypot(*up)
        along = np.array([-up[1], up[0]])
        reach = 2.0 * float(np.abs(mesh.points).max() + abs(load.level))
        corners = [
            load.level * up - reach * along,
            load.level * up - reach * along - 2.0 * reach * up,
            load.level * up + reach * along - 2.0 * reach * up,
            load.level * up + reach * along,
        ]

        def pressure(points: Floats) -> Floats:
            return load.specific_weight * _depth(load, points)

        pieces, owner = _pieces(mesh, element, cut)
        for parts in cutting.inside_polygon(pieces, corners):
            _add_parts(forces, element, numbering, parts, owner, pressure)
    return np.flatnonzero(depth.min(axis=1) >= 0.0)


def _add_patch(
    forces: Floats,
    element: Element,
    numbering: Numbering,
    load: RectanglePatch | DiscPatch,
) -> None:
    pieces, owner = _pieces(numbering.mesh, element)
    if isinstance(load, RectanglePatch):
        groups = cutting.inside_polygon(pieces, load.corners)
        area = load.size[0] * load.size[1]
    else:
        groups = cutting.inside_disc(pieces, load.centre, load.radius)
        area = np.pi * load.radius**2
    covered = sum(float(parts.weights.sum()) for parts in groups)
    if covered < (1.0 - MISSING) * area:
        x, y = load.centre
        raise InputError(
            f"only {100.0 * covered / area:.4g} % of the patch at ({x:.6g}, {y:.6g}) m "
            "lies on the plate; move or shrink it until it does not reach over an edge "
            "or a hole."
        )

    def pressure(points: Floats) -> Floats:
        return np.full(points.shape[:-1], load.force / area)

    for parts in groups:
        _add_parts(forces, element, numbering, parts, owner, pressure)


def _pieces(
    mesh: Mesh, element: Element, triangles: Ints | None = None
) -> tuple[Floats, Ints]:
    """Pieces on which w is one polynomial, (m, 3, 2), and their triangles, (m,)."""
    chosen = np.arange(len(mesh.triangles)) if triangles is None else triangles
    corners = mesh.points[mesh.triangles[chosen]]
    pieces = np.einsum("skv,nvc->nskc", element.pieces, corners)
    return pieces.reshape(-1, 3, 2), np.repeat(chosen, len(element.pieces))


def _add_parts(
    forces: Floats,
    element: Element,
    numbering: Numbering,
    parts: cutting.Parts,
    owner: Ints,
    pressure: object,
) -> None:
    """Add a pressure over parts of triangles."""
    assert callable(pressure)
    mesh = numbering.mesh
    q = parts.points.shape[1]
    step = max(1, 8 * BLOCK // q)
    for start in range(0, len(parts.triangles), step):
        block = slice(start, start + step)
        triangles = owner[parts.triangles[block]]
        points = parts.points[block]
        flat = mesh.barycentrics(np.repeat(triangles, q), points.reshape(-1, 2))
        rows = element.evaluate(
            mesh.points[mesh.triangles[triangles]], flat.reshape(-1, q, 3)
        )[:, :, 0]
        weighted = pressure(points) * parts.weights[block]
        own = np.einsum("nq,nqd->nd", weighted, rows)
        _add(forces, numbering.table[triangles], own[..., None])


def _add_point(
    forces: Floats,
    element: Element,
    numbering: Numbering,
    load: PointForce | PointMoment,
) -> None:
    mesh = numbering.mesh
    what = (
        f"a point force of {load.force:g} N"
        if isinstance(load, PointForce)
        else f"a couple of ({load.moment[0]:g}, {load.moment[1]:g}) N m"
    )
    try:
        triangle, barycentrics = mesh.locate([load.at])
    except InputError as error:
        raise InputError(f"{what}: {error}") from error
    rows = element.evaluate(
        mesh.points[mesh.triangles[triangle]], barycentrics[:, None]
    )
    if isinstance(load, PointForce):
        own = load.force * rows[:, 0, 0]
    else:
        # A couple about x turns the plate by dw/dy, one about y by -dw/dx.
        own = load.moment[0] * rows[:, 0, 2] - load.moment[1] * rows[:, 0, 1]
    _add(forces, numbering.table[triangle], own[..., None])


def _add_line(
    forces: Floats,
    element: Element,
    numbering: Numbering,
    load: LineForce | EdgeMoment,
) -> None:
    """Add a force or a moment along the edges of a side or a seam."""
    mesh = numbering.mesh
    seam = isinstance(load, LineForce) and load.along in mesh.seam_names
    if seam:
        edges = mesh.seam_edges[mesh.seam_numbers == mesh.seam_names.index(load.along)]
        stretch = np.ones(len(edges))
    elif load.along in mesh.side_names:
        own = np.flatnonzero(mesh.boundary_sides == mesh.side_names.index(load.along))
        edges, stretch = mesh.boundary_edges[own], mesh.boundary_stretch[own]
    else:
        names = [*mesh.side_names, *(mesh.seam_names if not seam else ())]
        raise InputError(
            f"a load acts along {load.along!r}; the sides and seams are "
            f"{', '.join(names)}."
        )
    share, weights = gauss(3)
    start, end = np.moveaxis(mesh.points[edges], 1, 0)
    step = end - start
    lengths = np.hypot(*step.T)
    triangles = mesh.triangles_at(edges)
    points = start[:, None] + share[:, None] * step[:, None]
    flat = mesh.barycentrics(
        np.repeat(triangles, len(share)), points.reshape(-1, 2)
    ).reshape(len(edges), len(share), 3)
    rows = element.evaluate(mesh.points[mesh.triangles[triangles]], flat)
    amount = (lengths * stretch)[:, None] * weights
    if isinstance(load, LineForce):
        own_forces = load.force * np.einsum("eq,eqd->ed", amount, rows[:, :, 0])
    else:
        normal = np.column_stack([step[:, 1], -step[:, 0]]) / lengths[:, None]
        turning = np.einsum("ec,eqcd->eqd", normal, rows[:, :, 1:])
        own_forces = load.moment * np.einsum("eq,eqd->ed", amount, turning)
    _add(forces, numbering.table[triangles], own_forces[..., None])
