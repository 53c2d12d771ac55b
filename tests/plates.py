"""Plates several tests solve, and a structured mesh."""

import numpy as np

from kplate.loads import Case
from kplate.materials import Isotropic
from kplate.mesh import Mesh
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.solution import Solution
from kplate.solve.static import solve_static

SIDES = ("south", "east", "north", "west")
THICKNESS = 0.01


def unit_material(nu=0.3, thickness=THICKNESS, D=1.0):
    """A material with which a plate of this thickness has the stiffness D."""
    return Isotropic(name="unit", E=12.0 * (1.0 - nu**2) * D / thickness**3, nu=nu)


def rectangle(supports, *, a=1.0, b=1.0, nu=0.3, thickness=THICKNESS, D=1e4):
    """A rectangle a x b with D = 1e4 N m; one support for all sides, or a dict."""
    held = supports if isinstance(supports, dict) else dict.fromkeys(SIDES, supports)
    return Plate(
        outline=Outline.polygon([(0, 0), (a, 0), (a, b), (0, b)], sides=SIDES),
        thickness=thickness,
        material=unit_material(nu, thickness, D),
        supports=held,
    )


def grid(n, *, a=1.0, b=1.0, m=None):
    """A mesh of n x m squares, each parted by a diagonal of alternating sense."""
    m = n if m is None else m
    x, y = np.meshgrid(
        np.linspace(0, a, n + 1), np.linspace(0, b, m + 1), indexing="ij"
    )
    number = np.arange((n + 1) * (m + 1)).reshape(n + 1, m + 1)
    p, q = number[:-1, :-1].ravel(), number[1:, :-1].ravel()
    r, s = number[1:, 1:].ravel(), number[:-1, 1:].ravel()
    i, j = np.divmod(np.arange(n * m), m)
    even = ((i + j) % 2 == 0)[:, None]
    first = np.where(even, np.c_[p, q, r], np.c_[p, q, s])
    second = np.where(even, np.c_[p, r, s], np.c_[q, r, s])
    south, north = number[:, 0], number[::-1, -1]
    east, west = number[-1, :], number[0, ::-1]
    edges, sides = [], []
    for k, line in enumerate((south, east, north, west)):
        edges.append(np.c_[line[:-1], line[1:]])
        sides.append(np.full(len(line) - 1, k))
    return Mesh(
        points=np.c_[x.ravel(), y.ravel()],
        triangles=np.r_[first, second],
        boundary_edges=np.vstack(edges),
        boundary_sides=np.concatenate(sides),
        side_names=SIDES,
    )


def solved(plate, mesh, *loads):
    """Solution on a given mesh of loads that act together."""
    return Solution(state=solve_static(plate, mesh, [Case(name="load", loads=loads)]))
