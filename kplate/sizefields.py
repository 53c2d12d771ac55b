"""How long the edges of a mesh are from place to place, as fields of Gmsh.

Edges are of one size but for arcs, curves shorter than it and refined places, from
which their length grows in proportion to the distance. The least of all fields holds.
"""

import math
from collections.abc import Sequence
from typing import Any

ALIKE = 2.0**0.25  # edges that differ by no more share one size
GROWTH = 0.35  # of the edges with the distance from a refined place
# Radius of the disc around a refined place in which all edges are fine, in edges: what
# is judged on the rim of an excluded disc lies inside.
WITHIN = 12.0


def grade(
    gmsh: Any,
    size: float,
    discs: Sequence[tuple[tuple[float, float], float, float]],
    around: tuple[int, int],
) -> None:
    """Let edges grow from arcs, short curves and refined places by one field.

    Parameters
    ----------
    gmsh : module
        Gmsh, with the geometry in its current model.
    size : float
        Length in m of the edges far from all of them.
    discs : sequence of (place, least, within)
        Places in m, the length of the edges around them, and how far they are so, in
        such edges.
    around : tuple of int
        Least number of edges on a full circle: where it is a rim, and where it lies
        inside.
    """
    field = gmsh.model.mesh.field
    tags = []
    for least, group in _curve_groups(gmsh, size, around):
        distance = field.add("Distance")
        field.setNumbers(distance, "CurvesList", group)
        field.setNumber(distance, "Sampling", max(around))
        tags.append(_growing(field, distance, least, size))
    for (x, y), least, within in discs:
        if least < size:
            ball = field.add("Ball")
            for key, value in {
                "XCenter": x,
                "YCenter": y,
                "Radius": within * least,
                "VIn": least,
                "VOut": size,
                "Thickness": (size - least) / GROWTH,
            }.items():
                field.setNumber(ball, key, value)
            tags.append(ball)
    if tags:
        smallest = field.add("Min")
        field.setNumbers(smallest, "FieldsList", tags)
        field.setAsBackgroundMesh(smallest)


def _curve_groups(
    gmsh: Any, size: float, around: tuple[int, int]
) -> list[tuple[float, list[int]]]:
    """Curves that need edges of less than the size, grouped with the least of each.

    A full circle gets `around` edges: where it is a rim, and where it lies inside.

    Grouped, since each group costs a search.
    """
    curves_by_edge = sorted(
        (_curve_edge(gmsh, curve, around[_lies_inside(gmsh, curve)]), curve)
        for _, curve in gmsh.model.getEntities(1)
    )
    groups: list[tuple[float, list[int]]] = []
    for edge, curve in curves_by_edge:
        if edge >= size:
            break
        if not groups or edge > ALIKE * groups[-1][0]:
            groups.append((edge, []))
        groups[-1][1].append(curve)
    return groups


def _lies_inside(gmsh: Any, curve: int) -> bool:
    """Whether a curve has surfaces on both sides."""
    surfaces, _ = gmsh.model.getAdjacencies(1, curve)
    return len(surfaces) != 1


def _curve_edge(gmsh: Any, curve: int, around: int) -> float:
    """Length of the edges in m that a curve needs: its own, or a part of its circle."""
    length = float(gmsh.model.occ.getMass(1, curve))
    low, high = gmsh.model.getParametrizationBounds(1, curve)
    bent = gmsh.model.getCurvature(1, curve, [0.5 * (low[0] + high[0])])[0]
    if bent <= 0.0:
        return length
    return min(length, 2.0 * math.pi / (around * float(bent)))


def _growing(field: Any, distance: int, least: float, size: float) -> int:
    """Field that grows from the least size with a distance.

    It is the least within a quarter of it, farther than a curve is from its samples, so
    that the edges on an arc are alike.
    """
    threshold = field.add("Threshold")
    for key, value in {
        "InField": float(distance),
        "SizeMin": least,
        "SizeMax": size,
        "DistMin": 0.25 * least,
        "DistMax": 0.25 * least + (size - least) / GROWTH,
    }.items():
        field.setNumber(threshold, key, value)
    return int(threshold)
