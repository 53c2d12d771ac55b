"""What of loads is not linear on triangles, which the dual cannot carry exactly."""

import numpy as np

from kplate import cutting
from kplate.arrays import Floats
from kplate.dofs import Numbering
from kplate.elements import bernstein
from kplate.loading import (
    BLOCK,
    FIELD_RULE,
    Shape,
    deflection_rows,
    depth_at,
    function_at,
    piece_areas,
    pieces_sampled,
)
from kplate.loads import (
    DiscPatch,
    Hydrostatic,
    Load,
    PressureField,
    RectanglePatch,
)
from kplate.mesh import Mesh
from kplate.quadrature import composite
from kplate.sampling import QUARTERS, sampled

# Share below which what is not linear of a pressure is round-off.
ROUND_OFF = 1e-12


def unbalanced(mesh: Mesh, load: Load) -> Floats:
    """Square integral, or more, of what of a pressure is not linear on each triangle.

    Returns
    -------
    ndarray, shape (n_triangles,)
        In N^2/m^2; 0 where the pressure is linear on the triangle.
    """
    match load:
        case RectanglePatch() | DiscPatch():
            if isinstance(load, RectanglePatch):
                groups = cutting.inside_polygon(
                    mesh.points[mesh.triangles], load.corners
                )
                height = load.force / (load.size[0] * load.size[1])
            else:
                groups = cutting.inside_disc(
                    mesh.points[mesh.triangles], load.centre, load.radius
                )
                height = load.force / (np.pi * load.radius**2)
            covered = np.zeros(len(mesh.triangles))
            for parts in groups:
                np.add.at(covered, parts.triangles, parts.weights.sum(axis=1))
            # Nothing, or the pressure everywhere, is a linear one.
            off = np.minimum(covered, mesh.areas - covered)
            off[off < ROUND_OFF * mesh.areas] = 0.0
            return height**2 * off
        case Hydrostatic():
            depth = depth_at(load, mesh.points[mesh.triangles])
            cut = (depth.min(axis=1) < 0.0) & (depth.max(axis=1) > 0.0)
            most = load.specific_weight * np.maximum(depth.max(axis=1), 0.0)
            return np.where(cut, most**2 * mesh.areas, 0.0)
        case PressureField():
            return _not_linear(mesh, load)
    return np.zeros(len(mesh.triangles))


def field_doubts(
    element: Shape, numbering: Numbering, load: PressureField, unknowns: Floats
) -> Floats:
    """What is not known of the work of a stated pressure on deflections, (c,).

    Where the pressure is not smooth, the sums over the last pieces (`sampling`) and
    over their quarters differ; the differences are added up without their signs.

    Parameters
    ----------
    element, numbering : Shape, Numbering
        What the unknowns belong to.
    load : PressureField
        The pressure.
    unknowns : ndarray, shape (count, c)
        Of the deflections.

    Returns
    -------
    ndarray, shape (c,)
        In N m for deflections in m.
    """
    total = np.zeros(unknowns.shape[1])
    known, owner = pieces_sampled(numbering, element, load)
    pieces, triangles = known.pieces[known.rough], owner[known.owners[known.rough]]
    fine = composite(QUARTERS, FIELD_RULE)
    points = np.concatenate([fine.points, FIELD_RULE.points])
    weights = np.concatenate([fine.weights, -FIELD_RULE.weights])
    for start in range(0, len(pieces), BLOCK):
        block = slice(start, start + BLOCK)
        own, at = triangles[block], points @ pieces[block]
        rows = deflection_rows(numbering, element, own, at)
        w = rows @ unknowns[numbering.table[own]]
        weighted = function_at(load, at) * weights * piece_areas(pieces[block])[:, None]
        total += np.abs(np.einsum("nq,nqc->nc", weighted, w)).sum(axis=0)
    return total


def _not_linear(mesh: Mesh, load: PressureField) -> Floats:
    """Square integral of what of a stated pressure is not linear, (n_triangles,)."""
    rule = FIELD_RULE
    corners = mesh.points[mesh.triangles]
    pressure = function_at(load, rule.points @ corners)
    mean = (pressure * rule.weights) @ rule.points
    best = np.linalg.solve(bernstein.masses(1), mean[..., None])[..., 0]
    off = pressure - best @ rule.points.T
    squared: Floats = mesh.areas * (off**2 @ rule.weights)
    whole = mesh.areas * (pressure**2 @ rule.weights)
    known = sampled(lambda points: function_at(load, points), corners)
    if len(known.pieces):
        # Of jumps over the pieces, and without the difference of large numbers there.
        n, areas = len(corners), piece_areas(known.pieces)
        at = FIELD_RULE.points @ known.pieces
        p, weights = function_at(load, at), areas[:, None] * FIELD_RULE.weights
        shape = mesh.barycentrics(
            np.repeat(known.owners, at.shape[1]), at.reshape(-1, 2)
        ).reshape(*p.shape, 3)
        mean = np.zeros((n, 3))
        np.add.at(mean, known.owners, np.einsum("kq,kqv->kv", weights * p, shape))
        mean /= mesh.areas[:, None]
        best = np.linalg.solve(bernstein.masses(1), mean[..., None])[..., 0]
        off = p - np.einsum("kqv,kv->kq", shape, best[known.owners])
        parted = np.zeros(n)
        np.add.at(parted, known.owners, np.sum(weights * off**2, axis=1))
        squared = np.where(parted > 0.0, parted, squared)
    return np.where(squared < ROUND_OFF**2 * whole, 0.0, squared)
