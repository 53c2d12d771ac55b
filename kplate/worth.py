"""What bands on a mesh are worth: bounds, or estimates and why.

A bound needs a deflection that the supports allow, moments in balance, and a mesh and
loads that are those of the plate as stated.
"""

from collections.abc import Sequence

import numpy as np

from kplate import cutting
from kplate.arrays import Bools, Floats
from kplate.boundary import seam_tangents, side_tangents
from kplate.elements.arcs import Arcs, no_arcs
from kplate.loading import depth_at
from kplate.loads import (
    Case,
    DiscPatch,
    Hydrostatic,
    LineForce,
    Load,
    PointForce,
    Pressure,
    PressureField,
    RectanglePatch,
)
from kplate.mesh import STRAIGHT_EDGE, Mesh
from kplate.plate import Plate
from kplate.polygon import SNAP
from kplate.shapes import Ellipse
from kplate.unbalanced import unbalanced
from kplate.values import Kind

ALONG = 65  # places along an arc at which a load is looked at
# Units in the last place by which the ends of an edge may be off.
ENDS = 8.0 * float(np.finfo(float).eps)
BENT = 1e-9  # tangents that differ by more are not those of the edges
# On 48 chords a circle's radius is 0.2 % too small in places; on 96 deflections under
# a ring load came out 0.1 % too large. Arcs lie within 1e-6 of the size of an ellipse,
# whose deflection then is 4e-6 off.
CHORDS, STANDING_IN = 2e-3, 2e-5
# Arcs of so many radii that meet along one side stand for another curve.
MANY = 3


def worth(
    plate: Plate, mesh: Mesh, cases: Sequence[Case], arcs: Arcs | None = None
) -> tuple[Kind, str]:
    """What bands on this mesh are worth, and why they are no bounds if they are not.

    `arcs` are the round edges that are followed; chords stand for the others.
    """
    arcs = no_arcs() if arcs is None else arcs
    loads = [load for case in cases for load in case.loads]
    reason = (
        _drawn(plate, mesh, arcs)
        or _bends(plate, mesh)
        or misplaced(plate, mesh, loads)
        or _cut(mesh, loads, arcs)
    )
    return ("estimate", reason) if reason else ("bound", "")


def drawn_share(plate: Plate, mesh: Mesh, arcs: Arcs) -> float:
    """Share of a value that what is drawn otherwise than stated may make, as a rule.

    `CHORDS` where chords stand for arcs, `STANDING_IN` where arcs do for other curves.
    """
    reason = _drawn(plate, mesh, arcs)
    if "chords" in reason:
        return CHORDS
    return STANDING_IN if reason else 0.0


def _drawn(plate: Plate, mesh: Mesh, arcs: Arcs) -> str:
    """What of the plate is round but drawn by chords."""
    outline = plate.outline
    for line in outline.lines:
        if isinstance(line, Ellipse):
            return f"ellipse {line.name} is drawn by arcs"
    curved = mesh.boundary_sides[mesh.boundary_circles != STRAIGHT_EDGE]
    sides = [mesh.side_names[int(side)] for side in curved]
    if len(arcs):
        for side in sides:
            support = plate.support(side)
            if support.holds_slope and not support.holds_deflection:
                return f"side {side} is round and holds the slope alone"
        sides = []
        for side in _other_curves(mesh):
            return f"side {side} is no circle but followed by arcs"
    names = [f"side {side}" for side in sides]
    for zone, section in zip(outline.zones, plate.sections[1:], strict=True):
        if section != plate.sections[0] and zone.shape.line.bulges.any():
            names.append(f"zone {zone.name}")
    for seam in outline.seams:
        if plate.support(seam.name).holds and seam.bulges.any():
            names.append(f"seam {seam.name}")
    return f"{names[0]} is round and drawn by chords" if names else ""


def _other_curves(mesh: Mesh) -> list[str]:
    """Sides with a run of arcs of many radii: they stand for an ellipse or a spline."""
    circles = mesh.boundary_circles
    arriving, leaving = mesh.boundary_joints.T
    first, second = circles[arriving], circles[leaving]
    both = (first != STRAIGHT_EDGE) & (second != STRAIGHT_EDGE) & (first != second)
    sides = mesh.boundary_sides[arriving]
    both &= sides == mesh.boundary_sides[leaving]
    found = []
    for side in np.unique(sides[both]):
        own = both & (sides == side)
        radii = mesh.circles[np.concatenate([first[own], second[own]]), 2]
        if len(np.unique(np.round(radii / radii.max(), 9))) >= MANY:
            found.append(mesh.side_names[side])
    return found


def _bends(plate: Plate, mesh: Mesh) -> str:
    """A side or seam that is held and bends, so that one tangent stands for two."""
    joints = mesh.boundary_joints
    ends = mesh.boundary_edges[:, 1]
    own = np.stack([mesh.tangents(joints[:, k], ends) for k in (0, 1)], axis=1)
    off = np.abs(side_tangents(plate, mesh) - own).max(axis=(1, 2))
    # Short edges know their direction no better than their ends their places.
    shortest = mesh.boundary_lengths[joints].min(axis=1)
    off -= ENDS * np.abs(mesh.points).max() / shortest
    for side in mesh.boundary_sides[joints[off > BENT, 0]].tolist():
        if plate.support(mesh.side_names[side]).holds:
            return f"side {mesh.side_names[side]} bends where it is held"
    vertices, edges, away, _ = seam_tangents(plate, mesh)
    own = mesh.points[mesh.seam_edges[edges]].sum(axis=1) - 2.0 * mesh.points[vertices]
    own /= np.hypot(*own.T)[:, None]
    off = np.abs(away - own).max(axis=1)
    for seam in mesh.seam_numbers[edges[off > BENT]].tolist():
        return f"seam {mesh.seam_names[seam]} bends where it is held"
    return ""


def misplaced(plate: Plate, mesh: Mesh, loads: Sequence[Load]) -> str:
    """A load that is not where, or what, it is stated to be."""
    shapes = {zone.name: zone.shape.line for zone in plate.outline.zones}
    lines = {seam.name: seam for seam in plate.outline.seams}
    for load in loads:
        match load:
            case Pressure(zone=str(name)) if shapes[name].bulges.any():
                return f"zone {name} is round and drawn by chords"
            case LineForce(along=name) if name in lines and lines[name].bulges.any():
                return f"seam {name} is round and drawn by chords"
            case PointForce(at=at):
                off = float(np.hypot(*(mesh.points - at).T).min())
                if off > SNAP * plate.outline.size:
                    return "a point force acts within a triangle"
            case PressureField():
                return "a pressure is stated as a function, of which samples are known"
    return ""


def _cut(mesh: Mesh, loads: Sequence[Load], arcs: Arcs) -> str:
    """A load whose edge passes through triangles with a round edge."""
    if not len(arcs):
        return ""
    along, _, _ = arcs.at(np.linspace(0.0, 1.0, 9))
    points = np.concatenate([along, arcs.vertices], axis=1)
    for load in loads:
        part = np.flatnonzero(~_loaded(load, points).all(axis=1))
        if unbalanced(mesh, load)[arcs.rows].any() or _at_bulges(
            load, arcs.chosen(part)
        ):
            return "a load is not linear on triangles at a round side"
    return ""


def _at_bulges(load: Load, arcs: Arcs) -> bool:
    """Whether the edge of a load passes between arcs and their chords."""
    along, _, _ = arcs.at(np.linspace(0.0, 1.0, ALONG))
    ends = along[:, 1:-1], along[:, 2:]
    first = np.broadcast_to(along[:, :1], ends[0].shape)
    bulges = np.stack([first, *ends], axis=2)[arcs.turn > 0.0].reshape(-1, 3, 2)
    match load:
        case Hydrostatic():
            depth = depth_at(load, along)
            return bool(((depth.min(axis=1) < 0.0) & (depth.max(axis=1) > 0.0)).any())
        case RectanglePatch():
            groups = cutting.inside_polygon(bulges, load.corners)
        case DiscPatch():
            groups = cutting.inside_disc(bulges, load.centre, load.radius)
        case _:
            return False
    return any(len(parts.triangles) > 0 for parts in groups)


def _loaded(load: Load, points: Floats) -> Bools:
    """Which points (n, q, 2) a load with an edge acts on; all of any other."""
    slight = SNAP * float(np.ptp(points, axis=(0, 1)).max())
    match load:
        case RectanglePatch(corners=corners):
            found = np.ones(points.shape[:-1], dtype=bool)
            middle = np.mean(corners, axis=0)
            for a, b in zip(corners, np.roll(corners, -1, axis=0), strict=True):
                normal = np.array([b[1] - a[1], a[0] - b[0]]) / np.hypot(*(b - a))
                side = np.sign((middle - a) @ normal)
                found &= side * ((points - a) @ normal) > -slight
            return found
        case DiscPatch(centre=centre, radius=radius):
            reach: Bools = np.hypot(*np.moveaxis(points - centre, -1, 0)) < (
                radius + slight
            )
            return reach
        case Hydrostatic(level=level, up=up):
            unit = np.asarray(up, dtype=float) / np.hypot(*up)
            wet: Bools = points @ unit < level + slight
            return wet
    return np.ones(points.shape[:-1], dtype=bool)
