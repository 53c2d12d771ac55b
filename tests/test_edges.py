"""Edges that meet at a vertex: the primal energy below the dual's, and the gap closing.

A constraint too many keeps the primal energy below the exact one, one too few lifts it
above the dual's: the vertex rule is right where the two close in on each other.
"""

from dataclasses import replace

import numpy as np
import pytest
from plates import grid, rectangle

from kplate.loads import Case, PressureField
from kplate.materials import STEEL
from kplate.mesh import Mesh
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.refine import refined
from kplate.singular import plate_corners
from kplate.solve.dual import solve_dual
from kplate.solve.static import solve_static
from kplate.supports import CLAMPED, FREE, SIMPLY_SUPPORTED

C, S, F = CLAMPED, SIMPLY_SUPPORTED, FREE
PAIRS = [(C, C), (S, S), (F, F), (C, S), (C, F), (S, F)]
ANGLES = (45.0, 90.0, 135.0, 180.0, 225.0, 270.0, 330.0)
# Linear, so that the dual of order 3 balances it exactly, and without symmetry.
LOAD = Case(name="load", loads=[PressureField(lambda x, y: 1.0 + 0.4 * x - 0.3 * y)])


def fan(degrees, turned=20.0):
    """Outline and mesh of a fan of triangles of this angle around vertex 0."""
    n = 2 + int(degrees / 30.0)
    radians = np.radians(turned + np.linspace(0.0, degrees, n))
    reach = 1.0 + 0.1 * (np.arange(n) % 2)  # on no circle
    rim = reach[:, None] * np.column_stack([np.cos(radians), np.sin(radians)])
    points = np.vstack([(0, 0), rim])
    k, loop = np.arange(1, n), np.arange(n + 1)
    sides = ["leaving", *["far"] * (n - 1), "arriving"]
    mesh = Mesh(
        points=points,
        triangles=np.c_[np.zeros(n - 1, dtype=int), k, k + 1],
        boundary_edges=np.c_[loop, np.roll(loop, -1)],
        boundary_sides=[0, *[1] * (n - 1), 2],
        side_names=("leaving", "far", "arriving"),
    )
    return Outline.polygon(points, sides=sides), mesh


def finer(mesh, corners, times):
    """All edges halved, and the triangles at corners some times more."""
    for _ in range(2):
        mesh = refined(mesh, np.ones(len(mesh.triangles), dtype=bool))
    for _ in range(times):  # corners keep their numbers
        mesh = refined(mesh, np.isin(mesh.triangles, corners).any(axis=1))
    return mesh


def gaps(plate, mesh):
    """Gap of HCT and of the quintic below the dual, as shares of its energy."""
    dual = solve_dual(plate, mesh, [LOAD]).energy[0]
    return np.array(
        [
            1.0
            - solve_static(plate, mesh, [LOAD], element=name).strain_energy[0] / dual
            for name in ("hct", "quintic")
        ]
    )


def closes(plate, mesh, shares):
    """Whether gaps are positive, and close to shares on a mesh twice as fine."""
    corners = np.arange(len(mesh.points))
    mesh = finer(mesh, corners, 4)
    before = gaps(plate, mesh)
    after = gaps(plate, finer(mesh, corners, 6))
    assert (before > -1e-9).all()
    assert (after > -1e-9).all()
    assert (after < np.array(shares) * before).all()


@pytest.mark.parametrize("degrees", ANGLES)
@pytest.mark.parametrize("pair", PAIRS, ids=lambda pair: "-".join(s.name for s in pair))
def test_energies_close_in_on_each_other(pair, degrees):
    outline, mesh = fan(degrees)
    supports = {"arriving": pair[0], "leaving": pair[1], "far": C}
    plate = Plate(
        outline=outline,
        thickness=0.01,
        material=STEEL,
        supports=supports,
        bend_turn=1e-9,  # one tangent at a bend would not be conforming
    )
    bounded = not any(corner.unbounded for corner in plate_corners(plate))
    closes(plate, mesh, (0.15, 0.1) if bounded else (0.5, 0.5))


# Inside: what holds the plate away from its rim. The meshes are grids of 2 x 2 squares,
# with the vertex 4 in the middle.


def square(*, seams=(), marks=(), supports=None):
    """Square plate and mesh with supports along lines and at points inside."""
    mesh, outline = grid(2), rectangle(S).outline
    held = {"south": S, "east": F, "north": C, "west": S}
    edges, numbers = [], []
    for number, (name, path) in enumerate(seams):
        outline = outline.seam(mesh.points[list(path)], name=name)
        pairs = np.column_stack([path[:-1], path[1:]])
        edges.append(pairs)
        numbers.append(np.full(len(pairs), number))
    for name, vertex in marks:
        outline = outline.mark(tuple(mesh.points[vertex]), name=name)
    mesh = replace(
        mesh,
        seam_edges=np.concatenate(edges) if edges else (),
        seam_numbers=np.concatenate(numbers) if numbers else (),
        seam_names=tuple(name for name, _ in seams),
        mark_vertices=[vertex for _, vertex in marks],
        mark_names=tuple(name for name, _ in marks),
    )
    plate = Plate(
        outline=outline, thickness=0.01, material=STEEL, supports=held | supports
    )
    return plate, mesh


WALL = ("wall", (1, 4, 7))  # from west to east through the middle
STUB = ("stub", (1, 4))  # a wall that ends in the middle
CROSS = ("cross", (3, 4, 5))
INSIDE = {
    "a wall across": ((WALL,), (), {"wall": S}),
    "a wall that ends inside": ((STUB,), (), {"stub": S}),
    "two walls that cross": ((WALL, CROSS), (), {"wall": S, "cross": S}),
    "a post": ((), (("post", 4),), {"post": S}),
    "a post on the rim": ((), (("post", 7),), {"post": S}),
    "a wall and a post on it": ((STUB,), (("post", 4),), {"stub": S, "post": S}),
}


@pytest.mark.parametrize("name", INSIDE)
def test_supports_inside_need_no_other_rule(name):
    seams, marks, supports = INSIDE[name]
    plate, mesh = square(seams=seams, marks=marks, supports=supports)
    closes(plate, mesh, (0.5, 0.5))


def test_a_wall_that_holds_the_slope_suits_hct_only():
    """The moment jumps there: one curvature at a vertex keeps the quintic away."""
    plate, mesh = square(seams=(WALL,), supports={"wall": C})
    for _ in range(4):
        mesh = refined(mesh, np.ones(len(mesh.triangles), dtype=bool))
    coarse = gaps(plate, mesh)
    fine = gaps(plate, finer(mesh, [], 0))
    assert fine[0] < 0.15 * coarse[0]
    assert fine[1] > 0.2 * coarse[1]
