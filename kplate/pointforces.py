"""Loads as forces at places, by quadrature."""

import math
from collections.abc import Sequence

import numpy as np

from kplate.arrays import Floats
from kplate.functionals import settled_vertices
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
from kplate.quadrature import composite, gauss, triangle_rule
from kplate.samples import Lattice

ENOUGH = 2000  # pieces of triangles, for pressures


def forces_at_places(
    plate: Plate, mesh: Mesh, loads: Sequence[Load]
) -> tuple[Floats, Floats] | None:
    """All loads as forces at places; ``None`` where one is a moment."""
    parts = []
    for load in loads:
        if isinstance(load, EdgeMoment | PointMoment):
            return None
        parts.append(_as_forces(plate, mesh, load))
    return np.concatenate([p for p, _ in parts]), np.concatenate([f for _, f in parts])


def _as_forces(plate: Plate, mesh: Mesh, load: Load) -> tuple[Floats, Floats]:
    """A load as forces at places."""
    match load:
        case PointForce(force=force, at=at):
            return np.array([at]), np.array([force])
        case RectanglePatch(force=force, size=size, centre=centre, angle=angle):
            s, weights = gauss(20)
            x, y = np.meshgrid(s - 0.5, s - 0.5, indexing="ij")
            local = np.column_stack([size[0] * x.ravel(), size[1] * y.ravel()])
            c, d = math.cos(angle), math.sin(angle)
            places = local @ np.array([[c, d], [-d, c]]) + centre
            return places, force * np.outer(weights, weights).ravel()
        case DiscPatch(force=force, centre=centre, radius=radius):
            s, weights = gauss(16)
            angles = 2.0 * np.pi * np.arange(40) / 40
            r = radius * np.repeat(s, 40)
            turned = np.tile(angles, 16)
            places = np.column_stack([r * np.cos(turned), r * np.sin(turned)]) + centre
            return places, force * np.repeat(2.0 * s * weights / 40, 40)
        case LineForce(force=force, along=along):
            _, edges = settled_vertices(mesh, along)
            start, end = np.moveaxis(mesh.points[edges], 1, 0)
            s, weights = gauss(4)
            places = start[:, None] + s[:, None] * (end - start)[:, None]
            lengths = np.hypot(*(end - start).T)
            return places.reshape(-1, 2), (force * np.outer(lengths, weights)).ravel()
    return _pressed(plate, mesh, load)


def _pressed(plate: Plate, mesh: Mesh, load: Load) -> tuple[Floats, Floats]:
    """A pressure as forces at places on all triangles."""
    count = len(mesh.triangles)
    lattice = Lattice.of(max(1, math.ceil(math.sqrt(ENOUGH / count))))
    degree = 4 if count < 5 * ENOUGH else 1
    rule = composite(lattice.barycentrics[lattice.triangles], triangle_rule(degree))
    places = rule.points @ mesh.points[mesh.triangles]
    x, y = places[..., 0], places[..., 1]
    pressure = np.zeros(x.shape)
    match load:
        case Pressure(value=value, zone=zone):
            here = np.ones(count, dtype=bool)
            if zone is not None:
                here = mesh.zones == mesh.zone_names.index(zone)
            pressure[here] = value
        case SelfWeight(acceleration=acceleration):
            own = np.array([(m.density or 0.0) * h for h, m in plate.sections])
            pressure[:] = (own * acceleration)[mesh.zones][:, None]
        case Hydrostatic(level=level, specific_weight=weight, up=up):
            depth = level - places @ (np.asarray(up, dtype=float) / np.hypot(*up))
            pressure = weight * np.maximum(depth, 0.0)
        case PressureField(function=function):
            pressure = np.broadcast_to(np.asarray(function(x, y), dtype=float), x.shape)
    forces = pressure * rule.weights * mesh.areas[:, None]
    return places.reshape(-1, 2), forces.ravel()
