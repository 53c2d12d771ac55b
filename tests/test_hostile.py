"""Hostile geometry: refused with a line that says where, or meshed right. Never a hang.

Every case runs through the statement and the mesh, and is checked afterwards: area,
sides, seams and marks as stated. The first nine are what is known to make raw meshers
hang, crack or lose pieces in silence.
"""

import math

import numpy as np
import pytest

from kplate.errors import InputError, KplateError
from kplate.meshing import mesh_outline, size_for
from kplate.outline import Outline
from kplate.polygon import Polygon
from kplate.shapes import Circle, Ellipse, Rectangle, Slot

SQUARE = [(0, 0), (1, 0), (1, 1), (0, 1)]


def square():
    return Outline.polygon(SQUARE, sides=["south", "east", "north", "west"])


def poly(points, name="h"):
    return Polygon(points=np.asarray(points, float), sides=(name,) * len(points))


def box(x, y, a, b, name="h"):
    return Rectangle(centre=(x + a / 2, y + b / 2), size=(a, b), name=name)


REFUSED = {
    "self-crossing outline": (
        lambda: Outline.polygon([(0, 0), (1, 1), (1, 0), (0, 1)]),
        "(0.5, 0.5)",
    ),
    "mark outside": (lambda: square().mark((1.2, 0.5), name="m"), "(1.2, 0.5)"),
    "mark in a hole": (
        lambda: square().cut(box(0.4, 0.4, 0.2, 0.2)).mark((0.5, 0.5), name="m"),
        "(0.5, 0.5)",
    ),
    "hole across the outline": (lambda: square().cut(box(0.9, 0.4, 0.2, 0.2)), "(1, "),
    "clockwise outline": (lambda: Outline.polygon(SQUARE[::-1]), "(0, 1)"),
    "vertices 1e-9 apart": (
        lambda: Outline.polygon([(0, 0), (1, 0), (1, 1e-9), (1, 1), (0, 1)]),
        "(1, 0)",
    ),
    "hole outside": (lambda: square().cut(box(2, 2, 0.2, 0.2)), "(1, 1)"),
    "hole that touches": (lambda: square().cut(box(0.8, 0.4, 0.2, 0.2)), "(1, "),
    "hole at a corner": (lambda: square().cut(box(0, 0, 0.2, 0.2)), "(0, 0)"),
    "hole around the plate": (lambda: square().cut(box(-1, -1, 3, 3)), "(0, 0)"),
    "hole like the outline": (lambda: square().cut(box(0, 0, 1, 1)), "(0, 0)"),
    "overlapping holes": (
        lambda: square().cut(box(0.2, 0.2, 0.3, 0.3), box(0.4, 0.4, 0.3, 0.3, "g")),
        "(0.4",
    ),
    "hole in a hole": (
        lambda: square().cut(box(0.2, 0.2, 0.5, 0.5), box(0.3, 0.3, 0.1, 0.1, "g")),
        "(0.3",
    ),
    "twice the same hole": (
        lambda: square().cut(box(0.2, 0.2, 0.5, 0.5), box(0.2, 0.2, 0.5, 0.5, "g")),
        "(0.45, 0.45)",
    ),
    "holes that share an edge": (
        lambda: square().cut(box(0.2, 0.2, 0.2, 0.2), box(0.4, 0.2, 0.2, 0.2, "g")),
        "(0.4, ",
    ),
    "holes that share a corner": (
        lambda: square().cut(box(0.2, 0.2, 0.2, 0.2), box(0.4, 0.4, 0.2, 0.2, "g")),
        "(0.4, 0.4)",
    ),
    "spike": (
        lambda: Outline.polygon([(0, 0), (1, 0), (2, 0), (1, 0), (1, 1)]),
        "(2, 0)",
    ),
    "slit of no width": (
        lambda: Outline.polygon(
            [(0, 0), (0.5, 0), (0.5, 0.5), (0.5, 0), (1, 0), (1, 1), (0, 1)]
        ),
        "(0.5, ",
    ),
    "neck of no width": (
        lambda: Outline.polygon(
            [(0, 0), (1, 0), (0.5, 0.5), (1, 1), (0, 1), (0.5, 0.5)]
        ),
        "(0.5, 0.5)",
    ),
    "all on a line": (lambda: Outline.polygon([(0, 0), (1, 0), (2, 0)]), "(0, 0)"),
    "two points": (lambda: Outline.polygon([(0, 0), (1, 0)]), "three pairs"),
    "not a number": (
        lambda: Outline.polygon([(0, 0), (1, math.nan), (1, 1)]),
        "(1, nan)",
    ),
    "farther than anyone draws": (
        lambda: Outline.polygon([(0, 0), (1e300, 0), (0, 1e300)]),
        "(1e+300, 0)",
    ),
    "seam off the plate": (
        lambda: square().seam([(0.5, 0.5), (1.5, 0.5)], name="s"),
        "(1.25, 0.5)",
    ),
    "seam through a hole": (
        lambda: (
            square().cut(box(0.4, 0.4, 0.2, 0.2)).seam([(0, 0.5), (1, 0.5)], name="s")
        ),
        "(0.5, 0.5)",
    ),
    "seam that crosses itself": (
        lambda: square().seam([(0, 0.2), (1, 0.8), (1, 0.2), (0, 0.8)], name="s"),
        "'s'",
    ),
    "seam of one point": (lambda: square().seam([(0.5, 0.5)], name="s"), "'s'"),
    "seam that stands still": (
        lambda: square().seam([(0.5, 0.5), (0.5, 0.5), (1, 1)], name="s"),
        "(0.5, 0.5)",
    ),
    "zone outside": (lambda: square().zone(box(2, 2, 1, 1), name="z"), "'z'"),
    "zone that sticks out": (
        lambda: square().zone(box(0.5, 0.5, 1, 0.2), name="z"),
        "'z'",
    ),
    "zone in a hole": (
        lambda: (
            square()
            .cut(box(0.2, 0.2, 0.6, 0.6))
            .zone(box(0.3, 0.3, 0.1, 0.1, "r"), name="z")
        ),
        "'z'",
    ),
    "zones that overlap": (
        lambda: (
            square()
            .zone(box(0.1, 0.1, 0.4, 0.4), name="y")
            .zone(box(0.3, 0.3, 0.4, 0.4), name="z")
        ),
        "'y' and 'z'",
    ),
    "arcs that cross": (
        lambda: Outline.polygon(SQUARE, bulges=[-2.0, 0, -2.0, 0]),
        "crosses",
    ),
    "arc of nearly a full turn": (
        lambda: Outline.polygon(SQUARE, bulges=[1e6, 0, 0, 0]),
        "bulge",
    ),
    "fillet larger than its sides": (
        lambda: square().fillet("south", "east", radius=3.0),
        "(1, 0)",
    ),
    "slot shorter than it is wide": (
        lambda: square().cut(Slot(centre=(0.5, 0.5), length=0.1, width=0.2, name="s")),
        "'s'",
    ),
    "names twice": (
        lambda: square().cut(box(0.4, 0.4, 0.2, 0.2, "south")),
        "'south'",
    ),
}


@pytest.mark.parametrize("case", REFUSED)
def test_it_is_refused_with_a_line_that_says_where(case):
    make, where = REFUSED[case]
    with pytest.raises(InputError) as caught:
        make()
    assert where in str(caught.value)
    assert "\n" not in str(caught.value)


MESHED = {
    "seam that ends on a side": lambda: square().seam([(0.5, 0.5), (1, 0.5)], name="a"),
    "mark on a side": lambda: square().mark((1, 0.3), name="m"),
    "mark on a corner": lambda: square().mark((1, 1), name="m"),
    "seams that cross": lambda: (
        square()
        .seam([(0, 0.5), (1, 0.5)], name="a")
        .seam([(0.5, 0), (0.5, 1)], name="b")
    ),
    "seams that meet at a point": lambda: (
        square()
        .seam([(0, 0), (0.5, 0.5)], name="a")
        .seam([(1, 0), (0.5, 0.5)], name="b")
    ),
    "seam along a side": lambda: square().seam([(0.2, 0), (0.8, 0)], name="a"),
    "seam along a zone's edge": lambda: (
        square()
        .zone(box(0.2, 0.2, 0.4, 0.4), name="z")
        .seam([(0.2, 0.1), (0.2, 0.9)], name="a")
    ),
    "seams that overlap": lambda: (
        square()
        .seam([(0.2, 0.5), (0.7, 0.5)], name="a")
        .seam([(0.5, 0.5), (0.9, 0.5)], name="b")
    ),
    "zones that share an edge": lambda: (
        square()
        .zone(box(0.1, 0.1, 0.3, 0.3), name="y")
        .zone(box(0.4, 0.2, 0.3, 0.3), name="z")
    ),
    "zone along the outline": lambda: square().zone(box(0, 0, 1, 0.3), name="z"),
    "zone over all of it": lambda: square().zone(box(0, 0, 1, 1), name="z"),
    "zone around a hole": lambda: (
        square()
        .cut(Circle(centre=(0.5, 0.5), radius=0.1, name="h"))
        .zone(Circle(centre=(0.5, 0.5), radius=0.2, name="r"), name="z")
    ),
    "zone half over a hole": lambda: (
        square()
        .cut(Circle(centre=(0.5, 0.5), radius=0.1, name="h"))
        .zone(box(0.5, 0.3, 0.3, 0.4), name="z")
    ),
    "mark on a seam in a zone": lambda: (
        square()
        .zone(box(0.2, 0.2, 0.5, 0.5), name="z")
        .seam([(0, 0.4), (1, 0.4)], name="a")
        .mark((0.3, 0.4), name="m")
    ),
    "strip 1000 to 1": lambda: Outline.polygon([(0, 0), (1, 0), (1, 1e-3), (0, 1e-3)]),
    "needle of a corner": lambda: Outline.polygon([(0, 0), (1, 0), (1, 0.01)]),
    "hole 1e-4 of the size": lambda: square().cut(
        Circle(centre=(0.5, 0.5), radius=1e-4, name="h")
    ),
    "hole that nearly touches": lambda: square().cut(
        Circle(centre=(0.5, 0.101), radius=0.1, name="h")
    ),
    "far from the origin": lambda: Outline.polygon(np.add(SQUARE, 1e5)),
    "reliefs at a notch": lambda: Outline.polygon(
        [(0, 0), (1, 0), (1, 0.5), (0.5, 0.5), (0.5, 1), (0, 1)], sides=list("abcdef")
    ).relieve("c", "d", radius=0.05),
    "ellipse": lambda: Outline.of(
        Ellipse(centre=(0, 0), size=(2, 1), name="e", angle=0.3)
    ),
}


@pytest.mark.parametrize("case", MESHED)
def test_it_is_meshed_as_stated(case):
    outline = MESHED[case]()
    mesh = mesh_outline(outline, size=size_for(outline, 600))
    assert mesh.area == pytest.approx(outline.area, rel=2e-3)
    assert set(mesh.boundary_sides.tolist()) == set(range(len(outline.side_names)))
    for number, seam in enumerate(outline.seams):
        ends = mesh.points[mesh.seam_edges[mesh.seam_numbers == number]]
        length = np.hypot(*(ends[:, 1] - ends[:, 0]).T).sum()
        assert length == pytest.approx(seam.path.length, rel=1e-9)
    for mark, vertex in zip(outline.marks, mesh.mark_vertices, strict=True):
        np.testing.assert_allclose(mesh.points[vertex], mark.at, atol=1e-12)
    for number, name in enumerate(outline.zone_names, start=1):
        area = mesh.areas[mesh.zones == number].sum()
        assert area == pytest.approx(outline.zone_area(name), rel=5e-3)


@pytest.mark.parametrize("size", [0.0, -1.0, math.nan, 1e-9])
def test_a_size_that_cannot_be_is_refused(size):
    with pytest.raises(KplateError, match="the mesh size is"):
        mesh_outline(square(), size=size)
