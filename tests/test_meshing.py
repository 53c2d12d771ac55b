"""Meshes by Gmsh: properties of what comes out, and Gmsh left as it was found."""

import math
import signal
from concurrent.futures import ThreadPoolExecutor

import gmsh
import numpy as np
import pytest
import shapely
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from kplate import curves
from kplate.errors import InputError, MeshError
from kplate.mesh import STRAIGHT_EDGE
from kplate.meshing import (
    EDGES_ON_CIRCLE,
    LARGEST,
    mesh_outline,
    refined_triangles,
    size_for,
)
from kplate.outline import Outline
from kplate.polygon import Polygon
from kplate.shapes import Circle, Ellipse, Rectangle, Slot
from kplate.sizefields import GROWTH, WITHIN

SQUARE = np.array([(0.0, 0.0), (1.0, 0.0), (1.0, 1.0), (0.0, 1.0)])
SIDES = ("south", "east", "north", "west")
PLATE = Outline.polygon(SQUARE, sides=SIDES)
HOLED = PLATE.cut(Circle(centre=(0.4, 0.5), radius=0.1, name="shaft"))


@pytest.fixture
def running_gmsh():
    """Gmsh as started by somebody else, with a model of theirs and a mesh in it."""
    gmsh.initialize(["theirs", "-v", "0"], readConfigFiles=False, interruptible=False)
    gmsh.model.add("theirs")
    gmsh.model.occ.addRectangle(0, 0, 0, 2, 1)
    gmsh.model.occ.synchronize()
    gmsh.model.mesh.generate(2)
    yield gmsh
    gmsh.finalize()


def corner_angles(mesh):
    """Angles of the triangles in degrees, (n, 3)."""
    corners = mesh.points[mesh.triangles]
    angles = []
    for k in range(3):
        u, v = (corners[:, (k + j) % 3] - corners[:, k] for j in (1, 2))
        cross = u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0]
        angles.append(np.arctan2(cross, np.einsum("kc,kc->k", u, v)))
    return np.degrees(np.column_stack(angles))


def edge_lengths(mesh):
    a, b = np.moveaxis(mesh.points[mesh.edges], 1, 0)
    return np.hypot(*(b - a).T)


def same(a, b):
    """Whether two meshes agree to the last bit."""
    names = ("points", "triangles", "boundary_edges", "boundary_sides", "circles")
    return all(np.array_equal(getattr(a, n), getattr(b, n)) for n in names)


def angles_of(mesh, own):
    """Angle about its circle that each boundary edge spans, 0 where straight, (k,)."""
    angle = np.zeros(own.sum())
    circle, chord = mesh.boundary_circles[own], mesh.boundary_lengths[own]
    bent = circle != STRAIGHT_EDGE
    radius = mesh.circles[circle[bent], 2]
    angle[bent] = 2.0 * np.arcsin(0.5 * chord[bent] / radius)
    return angle


def slivers(mesh):
    """Area between arcs and their chords, added where arcs bulge out, in m2.

    Circular segments: r^2 (angle - sin angle) / 2, elementary geometry.
    """
    every = np.ones(len(mesh.boundary_edges), dtype=bool)
    angle = angles_of(mesh, every)
    x, y, radius = mesh.circles[mesh.boundary_circles[angle > 0.0]].T
    a, b = np.moveaxis(mesh.points[mesh.boundary_edges[angle > 0.0]], 1, 0)
    left = (b - a)[:, 0] * (y - a[:, 1]) - (b - a)[:, 1] * (x - a[:, 0])
    angle = angle[angle > 0.0]
    return np.sum(np.sign(left) * 0.5 * radius**2 * (angle - np.sin(angle)))


def assert_fits(mesh, outline):
    """What holds for every mesh of an outline."""
    blur = 1e-12 * outline.size
    assert mesh.area + slivers(mesh) == pytest.approx(
        outline.area, abs=blur * outline.size
    )
    assert mesh.side_names == outline.side_names
    assert sorted(set(mesh.triangles.ravel())) == list(range(len(mesh.points)))
    assert len({tuple(e) for e in mesh.boundary_edges}) == len(mesh.boundary_edges)
    for number, name in enumerate(outline.side_names):
        own = mesh.boundary_sides == number
        line = next(line for line in outline.boundaries if name in line.sides)
        angle, ends = angles_of(mesh, own), mesh.points[mesh.boundary_edges[own]]
        assert angle.max() < 1.001 * 2.0 * np.pi / EDGES_ON_CIRCLE
        length = np.sum(mesh.boundary_lengths[own] / np.sinc(0.5 * angle / np.pi))
        assert length == pytest.approx(outline.side_length(name), rel=1e-9)
        x, y, radius = mesh.circles[mesh.boundary_circles[own][angle > 0.0]].T[
            ..., None
        ]
        points = ends[angle > 0.0]
        reach = np.hypot(points[..., 0] - x, points[..., 1] - y)
        np.testing.assert_allclose(reach, radius + 0.0 * reach, rtol=0.0, atol=blur)
        pieces = np.stack([line.points, line.ends], axis=1)
        straight = [
            piece
            for piece, side, bulge in zip(pieces, line.sides, line.bulges, strict=True)
            if side == name and bulge == 0.0
        ]
        if not straight:
            assert (angle > 0.0).all()
            continue
        flat = shapely.points(ends[angle == 0.0])
        side = shapely.MultiLineString(straight)
        assert shapely.distance(flat, side).max() < blur
    for line in outline.boundaries:  # its vertices are points of the mesh
        apart = line.points[:, None] - mesh.points
        assert np.hypot(*np.moveaxis(apart, -1, 0)).min(axis=1).max() < blur


@st.composite
def stars(draw):
    """A star of five to nine corners with up to two holes, a circle and a square."""
    n = draw(st.integers(5, 9))
    shift = draw(st.lists(st.floats(-0.25, 0.25), min_size=n, max_size=n))
    radii = draw(st.lists(st.floats(0.4, 1.0), min_size=n, max_size=n))
    angles = 2.0 * np.pi * (np.arange(n) + shift) / n
    outline = Outline.polygon(
        np.array(radii)[:, None] * np.c_[np.cos(angles), np.sin(angles)]
    )
    holes = (
        Circle(centre=(-0.06, 0.0), radius=0.03, name="shaft"),
        Polygon(points=(0.03, -0.03) + 0.06 * SQUARE, sides=["a", "b", "a", "d"]),
    )
    return outline.cut(*holes[: draw(st.integers(0, 2))])


@settings(max_examples=15)
@given(stars())
def test_any_outline_is_covered_and_its_sides_kept(outline):
    mesh = mesh_outline(outline, size=0.05)  # less than the gaps between its lines
    assert_fits(mesh, outline)
    inner = np.pi - np.abs(outline.rim.turns)
    assume(np.degrees(inner.min()) > 35.0)
    assert corner_angles(mesh).min() > 15.0


@pytest.mark.parametrize("holes", [0, 1, 2])
@pytest.mark.parametrize("radius", [0.02, 0.5, 40.0])
def test_a_round_plate_is_covered(radius, holes):
    cut = (
        Circle(centre=(3.0 + 0.3 * radius, 5.0), radius=0.2 * radius, name="shaft"),
        Polygon(
            points=(3.0 - 0.6 * radius, 5.0) + 0.4 * radius * (SQUARE - (0, 0.5)),
            sides=SIDES,
        ),
    )
    outline = Outline.circle((3.0, 5.0), radius=radius).cut(*cut[:holes])
    mesh = mesh_outline(outline, size=0.15 * radius)
    assert_fits(mesh, outline)
    assert corner_angles(mesh).min() > 20.0


def test_a_circle_has_more_edges_where_the_size_asks_for_them():
    mesh = mesh_outline(Outline.circle((0, 0), radius=1.0), size=0.05)
    # Each of four arcs rounds up.
    assert 2 * np.pi / 0.05 < len(mesh.boundary_edges) < 2 * np.pi / 0.05 + 4


def test_the_edges_around_a_circle_are_alike():
    mesh = mesh_outline(HOLED, size=0.3)
    round_edges = mesh.boundary_lengths[mesh.boundary_sides == 4]
    assert len(round_edges) == EDGES_ON_CIRCLE
    np.testing.assert_allclose(round_edges, round_edges[0], rtol=1e-5)


def test_circles_of_other_sizes_do_not_get_each_others_edges():
    small = Circle(centre=(0.8, 0.8), radius=0.01, name="small")
    mesh = mesh_outline(HOLED.cut(small), size=0.3)
    assert np.bincount(mesh.boundary_sides)[4:].tolist() == [EDGES_ON_CIRCLE] * 2


# Size and number


@pytest.mark.parametrize("triangles", [1000, 5000])
@pytest.mark.parametrize(
    "outline",
    [
        PLATE,
        HOLED,
        Outline.circle((0, 0), radius=2.0),
        Outline.polygon(SQUARE * (3.0, 0.5)),
    ],
)
def test_a_mesh_has_about_as_many_triangles_as_asked_for(outline, triangles):
    """And around a circle as many more as grow from 96 edges to the size."""
    size = size_for(outline, triangles)
    mesh = mesh_outline(outline, size=size)
    around = 0.0
    for line in outline.lines:
        if isinstance(line, Circle):
            least = min(line.perimeter / EDGES_ON_CIRCLE, size)
            # Integral of the density 4 / (sqrt(3) s^2) with s growing off the circle.
            grown = (1.0 / least - 1.0 / size) / GROWTH
            around += 4.0 / math.sqrt(3.0) * line.perimeter * grown
    assert 0.8 * triangles < len(mesh.triangles) < 1.35 * (triangles + around)
    far = np.ones(len(mesh.edges), dtype=bool)
    for x, y, radius in mesh.circles:
        middles = mesh.points[mesh.edges].mean(axis=1)
        off = np.abs(np.hypot(*(middles - (x, y)).T) - radius)
        far &= off > size / GROWTH
    assert np.median(edge_lengths(mesh)[far]) == pytest.approx(size, rel=0.15)
    assert edge_lengths(mesh).max() < 1.7 * size


def test_size_for_is_that_of_equal_triangles():
    """An equilateral triangle of edge a has the area sqrt(3)/4 a^2."""
    size = size_for(PLATE, 1000)
    assert 1000 * math.sqrt(3.0) / 4.0 * size**2 == pytest.approx(1.0, rel=1e-14)


def test_edges_are_short_at_fine_places_and_grow_away_from_them():
    places = [((0.0, 0.0), 0.002), ((0.7, 0.6), 0.005), ((1.0, 0.4), 0.01)]
    mesh = mesh_outline(PLATE, size=0.1, fine=places)
    assert_fits(mesh, PLATE)
    middles, lengths = mesh.points[mesh.edges].mean(axis=1), edge_lengths(mesh)
    for place, size in places:
        away = np.hypot(*(middles - place).T)
        near = lengths[away < 2.0 * size]
        assert near.size > 3
        assert 0.4 * size < near.min()
        assert near.max() < 2.0 * size
    assert len(mesh.triangles) < 4000
    away = np.min([np.hypot(*(middles - p).T) for p, _ in places], axis=0)
    assert np.median(lengths[away > 0.35]) == pytest.approx(0.1, rel=0.2)
    assert corner_angles(mesh).min() > 25.0


def test_a_place_coarser_than_the_mesh_changes_nothing():
    fine = [((0.5, 0.5), 0.1), ((0.2, 0.2), 7.0)]
    assert same(mesh_outline(PLATE, size=0.1, fine=fine), mesh_outline(PLATE, size=0.1))


# Extremes


def test_a_sliver_of_a_plate_is_meshed():
    sliver = Outline.polygon(SQUARE * (1.0, 1e-3), sides=SIDES)
    mesh = mesh_outline(sliver, size=1e-3)
    assert_fits(mesh, sliver)
    assert corner_angles(mesh).min() > 30.0


@pytest.mark.parametrize(
    "hole",
    [
        Circle(centre=(0.5, 0.5), radius=0.5e-4, name="hole"),
        Polygon(points=0.5 + 1e-4 * SQUARE, sides=["hole"] * 4),
    ],
)
def test_a_tiny_hole_is_kept(hole):
    outline = PLATE.cut(hole)
    mesh = mesh_outline(outline, size=0.03)
    assert_fits(mesh, outline)
    assert corner_angles(mesh).min() > 15.0


NEAR = 1e-3 * math.sqrt(2.0)


@pytest.mark.parametrize(
    "outline",
    [
        PLATE.cut(Circle(centre=(0.2 + NEAR, 0.5), radius=0.2, name="hole")),
        PLATE.cut(Polygon(points=(NEAR, 0.3) + 0.4 * SQUARE, sides=["hole"] * 4)),
        PLATE.cut(
            Circle(centre=(0.3, 0.5), radius=0.1, name="a"),
            Circle(centre=(0.5 + NEAR, 0.5), radius=0.1, name="b"),
        ),
        Outline.circle((0, 0), radius=0.5).cut(
            Circle(centre=(0.25 - NEAR, 0), radius=0.25, name="hole")
        ),
        Outline.circle((0, 0), radius=0.5).cut(
            Polygon(points=[(0, 0), (0.5 - NEAR, 0), (0, 0.3)], sides=["hole"] * 3)
        ),
    ],
)
def test_a_hole_that_nearly_touches_is_kept(outline):
    assert_fits(mesh_outline(outline, size=0.05), outline)


@pytest.mark.parametrize("x", [1e3, 1e5])
def test_a_plate_in_coordinates_of_its_site_is_meshed(x):
    here = np.array([x + 0.123, x / 3])
    circle = Circle(centre=tuple(here + 0.5), radius=0.2, name="shaft")
    outline = Outline.polygon(here + SQUARE, sides=SIDES).cut(circle)
    mesh = mesh_outline(outline, size=0.1)
    chords = 0.2 * np.sin(np.pi / np.sum(mesh.boundary_sides == 4))
    assert mesh.area == pytest.approx(outline.area, abs=2 * math.pi * 0.2 * chords)
    assert corner_angles(mesh).min() > 20.0


@pytest.mark.parametrize("scale", [1e-3, 1e3])
def test_scaling_a_plate_scales_its_mesh(scale):
    hole = Circle(centre=(0.4 * scale, 0.5 * scale), radius=0.1 * scale, name="shaft")
    outline = Outline.polygon(scale * SQUARE, sides=SIDES).cut(hole)
    mesh = mesh_outline(outline, size=0.1 * scale)
    assert mesh.area / scale**2 == pytest.approx(mesh_outline(HOLED, size=0.1).area)
    assert corner_angles(mesh).min() > 20.0


# Refusals


@pytest.mark.parametrize("triangles", [3, 0, -5, LARGEST + 1, math.nan])
def test_a_number_of_triangles_out_of_range_is_refused(triangles):
    with pytest.raises(InputError) as caught:
        size_for(PLATE, triangles)
    assert str(caught.value) == (
        f"triangles = {triangles}; ask for a number between 4 and 5000000."
    )


@pytest.mark.parametrize("size", [0.0, -0.1, 1e-4, math.nan, math.inf])
def test_a_size_that_cannot_be_is_refused(size):
    with pytest.raises(InputError) as caught:
        mesh_outline(PLATE, size=size)
    assert str(caught.value) == (
        f"the mesh size is {size:g} m; it must be finite and at least 0.00068 m for "
        "this outline."
    )


@pytest.mark.parametrize("least", [0.0, -1.0, math.nan, math.inf])
def test_a_fine_place_needs_a_positive_size(least):
    with pytest.raises(InputError) as caught:
        mesh_outline(PLATE, size=0.1, fine=[((0.5, 0.5), least)])
    assert str(caught.value) == (
        f"the mesh size is {least:g} m at (0.5, 0.5) m; it must be a positive number, "
        "at a place with finite coordinates."
    )


def test_a_fine_place_is_a_place():
    with pytest.raises(InputError, match=r"0\.01 m at \(nan, 0\) m"):
        mesh_outline(PLATE, size=0.1, fine=[((math.nan, 0.0), 0.01)])


def test_what_gmsh_cannot_mesh_is_said_so(monkeypatch):
    def fail(dim):
        raise Exception("no luck")  # as Gmsh does

    monkeypatch.setattr(gmsh.model.mesh, "generate", fail)
    with pytest.raises(MeshError) as caught:
        mesh_outline(PLATE, size=0.1)
    assert str(caught.value) == (
        "the outline could not be meshed at size 0.1 m (no luck); try another size."
    )
    assert not gmsh.isInitialized()


def test_no_triangles_are_no_mesh(monkeypatch):
    monkeypatch.setattr(gmsh.model.mesh, "generate", lambda dim: None)
    with pytest.raises(MeshError) as caught:
        mesh_outline(PLATE, size=0.1)
    assert str(caught.value) == (
        "the outline could not be meshed: no triangles came out."
    )


def test_a_mesh_without_its_hole_is_noticed(monkeypatch):
    add = gmsh.model.occ.addPlaneSurface
    monkeypatch.setattr(gmsh.model.occ, "addPlaneSurface", lambda loops: add(loops[:1]))
    with pytest.raises(
        MeshError, match="the triangles leave side 'shaft' out; try another"
    ):
        mesh_outline(HOLED, size=0.1)


def test_a_mesh_of_another_area_is_noticed(monkeypatch):
    """By 1e-7 of a circle's radius: less than the chords take, so they are allowed."""
    add = gmsh.model.occ.addPoint

    def grown(x, y, z):
        near = math.hypot(x - 0.4, y - 0.5) < 0.2
        scale = 1 + 1e-7 if near else 1.0
        return add(0.4 + scale * (x - 0.4), 0.5 + scale * (y - 0.5), z)

    monkeypatch.setattr(gmsh.model.occ, "addPoint", grown)
    with pytest.raises(MeshError, match=r"the mesh covers .* please report the outl"):
        mesh_outline(HOLED, size=0.1)


def test_a_mesh_off_its_sides_is_noticed(monkeypatch):
    add = gmsh.model.occ.addPoint
    monkeypatch.setattr(
        gmsh.model.occ, "addPoint", lambda x, y, z: add(x + 1e-4 * (y > 0.9), y, z)
    )
    with pytest.raises(MeshError) as caught:
        mesh_outline(PLATE, size=0.1)
    assert str(caught.value) == (
        "a boundary curve near (1.00005, 0.5) m lies on no side; please report the "
        "outline."
    )


def test_missing_system_libraries_are_named(monkeypatch):
    def load(name, *rest, real=__import__):
        if name == "gmsh":
            raise OSError("libGLU.so.1: cannot open shared object file")
        return real(name, *rest)

    monkeypatch.setattr("builtins.__import__", load)
    with pytest.raises(MeshError) as caught:
        mesh_outline(PLATE, size=0.1)
    assert str(caught.value) == (
        "Gmsh cannot start: libGLU.so.1: cannot open shared object file. Install the "
        "system libraries that the README lists (on Debian: libglu1-mesa libgl1 "
        "libxcursor1 libxft2 libxinerama1 libgomp1)."
    )


# Gmsh as it was found


def test_the_same_outline_gives_the_same_mesh_to_the_last_bit():
    fine = [((0.0, 0.0), 0.01)]
    first = mesh_outline(HOLED, size=0.07, fine=fine)
    mesh_outline(PLATE, size=0.2)
    assert same(mesh_outline(HOLED, size=0.07, fine=fine), first)


def test_gmsh_is_not_left_running():
    assert not gmsh.isInitialized()
    mesh_outline(PLATE, size=0.2)
    assert not gmsh.isInitialized()


def test_interrupts_stay_with_whoever_handles_them():
    def own(number, frame):
        raise AssertionError

    before = signal.signal(signal.SIGINT, own)
    try:
        mesh_outline(PLATE, size=0.2)
        assert signal.getsignal(signal.SIGINT) is own
    finally:
        signal.signal(signal.SIGINT, before)


def test_gmsh_says_nothing(running_gmsh, capfd):
    running_gmsh.option.setNumber("General.Terminal", 1)
    running_gmsh.option.setNumber("General.Verbosity", 5)
    capfd.readouterr()
    mesh_outline(PLATE, size=0.2)
    assert capfd.readouterr() == ("", "")


def test_a_model_of_somebody_else_is_kept_and_stays_current(running_gmsh):
    running_gmsh.model.add("another")
    running_gmsh.model.setCurrent("theirs")
    nodes = running_gmsh.model.mesh.getNodes()[1]
    entities = running_gmsh.model.getEntities()
    models = running_gmsh.model.list()
    mesh_outline(HOLED, size=0.1, fine=[((0.0, 0.0), 0.01)])
    assert running_gmsh.isInitialized()
    assert running_gmsh.model.list() == models
    assert running_gmsh.model.getCurrent() == "theirs"
    assert running_gmsh.model.getEntities() == entities
    np.testing.assert_array_equal(running_gmsh.model.mesh.getNodes()[1], nodes)
    assert len(running_gmsh.model.mesh.field.list()) == 0


def test_models_of_our_own_name_are_kept(running_gmsh):
    for name in ("kplate", "kplate_"):
        running_gmsh.model.add(name)
        running_gmsh.model.occ.addPoint(0, 0, 0)
        running_gmsh.model.occ.synchronize()
    mesh_outline(PLATE, size=0.2)
    assert running_gmsh.model.getCurrent() == "kplate_"
    assert running_gmsh.model.list() == ["", "theirs", "kplate", "kplate_"]
    for name in ("kplate", "kplate_"):
        running_gmsh.model.setCurrent(name)
        assert running_gmsh.model.getEntities() == [(0, 1)]


def test_everything_is_put_back_after_a_failure(running_gmsh, monkeypatch):
    running_gmsh.option.setNumber("Mesh.Algorithm", 8)

    def fail(dim):
        raise Exception("no luck")  # as Gmsh does

    monkeypatch.setattr(gmsh.model.mesh, "generate", fail)
    with pytest.raises(MeshError):
        mesh_outline(PLATE, size=0.2)
    assert running_gmsh.model.list() == ["", "theirs"]
    assert running_gmsh.model.getCurrent() == "theirs"
    assert running_gmsh.option.getNumber("Mesh.Algorithm") == 8


OPTIONS = {
    "General.Verbosity": 3,
    "Mesh.Algorithm": 8,
    "Mesh.ElementOrder": 2,
    "Mesh.MaxNumThreads1D": 2,
    "Mesh.MeshSizeExtendFromBoundary": 0,
    "Mesh.MeshSizeFactor": 0.5,
    "Mesh.MeshSizeFromCurvature": 200,
    "Mesh.MeshSizeFromPoints": 0,
    "Mesh.MeshSizeMax": 0.01,
    "Mesh.MeshSizeMin": 0.3,
    "Mesh.MinimumCircleNodes": 200,
    "Mesh.RecombineAll": 1,
    "Mesh.Smoothing": 10,
    "Mesh.SubdivisionAlgorithm": 1,
}


@pytest.mark.parametrize("option", OPTIONS)
def test_options_of_somebody_else_change_no_mesh_and_are_kept(option, running_gmsh):
    running_gmsh.option.setNumber(option, OPTIONS[option])
    inside = mesh_outline(HOLED, size=0.1)
    assert running_gmsh.option.getNumber(option) == OPTIONS[option]
    running_gmsh.finalize()
    alone = mesh_outline(HOLED, size=0.1)
    running_gmsh.initialize(interruptible=False)
    assert same(inside, alone)


def test_two_threads_at_once_make_the_right_meshes():
    sizes = [0.1, 0.13, 0.08, 0.11] * 2
    expected = [mesh_outline(HOLED, size=size) for size in sizes]
    with ThreadPoolExecutor(2) as threads:
        found = list(threads.map(lambda size: mesh_outline(HOLED, size=size), sizes))
    assert all(same(a, b) for a, b in zip(found, expected, strict=True))
    assert not gmsh.isInitialized()


# Triangles of a graded place


@pytest.mark.parametrize("ratio", [1.5, 10.0, 1e4])
def test_refined_triangles_are_the_integral_over_the_graded_disc(ratio):
    """Equilateral triangles: 4 / (sqrt(3) s^2) per area.

    Their edge s is 1 up to r = WITHIN and grows by GROWTH from there.
    """
    most = WITHIN + (ratio - 1.0) / GROWTH
    r, step = np.linspace(0.0, most, 2_000_001, retstep=True)
    edge = 1.0 + GROWTH * np.maximum(r - WITHIN, 0.0)
    density = 2.0 * np.pi * r * 4.0 / (math.sqrt(3.0) * edge**2)
    integral = step * (density.sum() - 0.5 * (density[0] + density[-1]))
    assert refined_triangles(ratio) == pytest.approx(integral, rel=1e-4)


@pytest.mark.parametrize("ratio", [1.0, 0.3, 0.0])
def test_a_place_no_finer_than_the_mesh_takes_no_triangles(ratio):
    assert refined_triangles(ratio) == 0.0


@pytest.mark.parametrize("ratio", [10.0, 100.0])
def test_a_graded_place_takes_up_to_twice_the_triangles_foreseen(ratio):
    plain = mesh_outline(PLATE, size=0.04)
    graded = mesh_outline(PLATE, size=0.04, fine=[((0.5, 0.5), 0.04 / ratio)])
    reach = 0.04 * (WITHIN / ratio + (1.0 - 1.0 / ratio) / GROWTH)
    before = math.pi * reach**2 * len(plain.triangles)
    found = before + len(graded.triangles) - len(plain.triangles)
    assert 1.0 < found / refined_triangles(ratio) < 2.0


# Arcs

ROUND = {
    "fillet": PLATE.fillet("south", "east", radius=0.15),
    "relief": PLATE.relieve("south", "east", radius=0.15),
    "slot": PLATE.cut(
        Slot(centre=(0.5, 0.5), length=0.5, width=0.15, angle=0.4, name="hole")
    ),
    "rounded rectangle": PLATE.cut(
        Rectangle(centre=(0.5, 0.5), size=(0.5, 0.3), corner_radius=0.05, name="hole")
    ),
    "ellipse": Outline.of(Ellipse(centre=(1, 2), size=(1.5, 0.6), name="rim")),
    "elliptic hole": PLATE.cut(Ellipse(centre=(0.5, 0.5), size=(0.6, 0.3), name="h")),
    "shallow arc": Outline.polygon(SQUARE, sides=SIDES, bulges=[0, 1e-3, 0, -1e-3]),
    "most of a circle": Outline.polygon(SQUARE, sides=SIDES, bulges=[0, 2, 0, 0]),
    "parted circle": Outline.circle((0, 0), radius=1).part(
        "rim", name="arc", fractions=(0.1, 0.3)
    ),
    "one name": Outline.polygon(
        SQUARE, sides=["rim", "rim", "north", "rim"], bulges=[0, 0.3, 0, 0]
    ),
}


@pytest.mark.parametrize("size", [0.3, 0.05])
@pytest.mark.parametrize("name", ROUND)
def test_points_of_arcs_lie_on_the_true_arcs(name, size):
    mesh = mesh_outline(ROUND[name], size=size)
    assert_fits(mesh, ROUND[name])
    assert corner_angles(mesh).min() > 20.0


@st.composite
def rounded_stars(draw):
    """A star, some of its corners rounded, and perhaps a slot in its middle."""
    n = draw(st.integers(4, 7))
    shift = draw(st.lists(st.floats(-0.2, 0.2), min_size=n, max_size=n))
    radii = draw(st.lists(st.floats(0.6, 1.0), min_size=n, max_size=n))
    angles = 2.0 * np.pi * (np.arange(n) + shift) / n
    points = np.array(radii)[:, None] * np.c_[np.cos(angles), np.sin(angles)]
    outline = Outline.polygon(points)
    for k in range(n):
        own = ("side-1", f"side-{n}") if k == 0 else (f"side-{k}", f"side-{k + 1}")
        if draw(st.booleans()):
            turn = abs(float(Outline.polygon(points).rim.turns[k]))
            assume(turn > 0.1)
            # Takes less than half of the shortest side.
            outline = outline.fillet(*own, radius=0.08 / math.tan(0.5 * turn))
    if draw(st.booleans()):
        slot = Slot(
            centre=(0, 0),
            length=0.3,
            width=draw(st.floats(0.02, 0.2)),
            angle=draw(st.floats(-3.0, 3.0)),
            name="slot",
        )
        outline = outline.cut(slot)
    return outline


@settings(max_examples=15)
@given(rounded_stars())
def test_any_outline_with_rounded_corners_is_covered(outline):
    mesh = mesh_outline(outline, size=0.1)
    assert_fits(mesh, outline)


# Aims: a plate with a small hole keeps its number of triangles and its angles.


def test_a_small_hole_takes_few_triangles():
    """At most a fifth more than the 20,000 asked for; angles over 25 degrees."""
    outline = PLATE.cut(Circle(centre=(0.4, 0.5), radius=0.02, name="shaft"))
    mesh = mesh_outline(outline, size=size_for(outline, 20_000))
    assert 18_000 < len(mesh.triangles) < 24_000
    coarse = mesh_outline(outline, size=size_for(outline, 1000))
    assert corner_angles(coarse).min() > 25.0


@pytest.mark.parametrize("triangles", [200, 1000])
def test_a_tiny_hole_has_good_angles_in_a_coarse_mesh(triangles):
    outline = PLATE.cut(Circle(centre=(0.5, 0.5), radius=0.5e-4, name="hole"))
    mesh = mesh_outline(outline, size=size_for(outline, triangles))
    assert_fits(mesh, outline)
    assert corner_angles(mesh).min() > 20.0


# Zones, seams and marks


def boxed(x0, y0, x1, y1):
    """A rectangle between two corners."""
    return Polygon(points=[(x0, y0), (x1, y0), (x1, y1), (x0, y1)], sides=["edge"] * 4)


def assert_parts(mesh, outline):
    """Zones cover their areas, seams their lengths, marks their places; no cracks.

    That each edge has one or two triangles, and seams are edges, `Mesh` has checked.
    """
    assert mesh.zone_names == ("plate", *outline.zone_names)
    for number, zone in enumerate(outline.zones, start=1):
        own = mesh.zones == number
        centres = mesh.points[mesh.triangles].mean(axis=1)
        inside = shapely.contains_xy(zone.shape.line.region, *centres.T)
        straight = (zone.shape.line.bulges == 0.0).all() and not mesh.circles.size
        if straight:
            np.testing.assert_array_equal(inside, own)
        area = outline.zone_area(zone.name)
        slack = 1e-12 if straight else 2e-3
        assert mesh.areas[own].sum() == pytest.approx(area, rel=slack)
    assert mesh.seam_names == tuple(seam.name for seam in outline.seams)
    for number, seam in enumerate(outline.seams):
        ends = mesh.points[mesh.seam_edges[mesh.seam_numbers == number]]
        length = np.hypot(*(ends[:, 1] - ends[:, 0]).T).sum()
        slack = 1e-12 if (seam.bulges == 0.0).all() else 2e-3
        exact = curves.lengths(seam.points[:-1], seam.points[1:], seam.bulges).sum()
        assert length == pytest.approx(exact, rel=slack)
        off = curves.distances(
            ends.reshape(-1, 2), seam.points[:-1], seam.points[1:], seam.bulges
        )
        assert off.min(axis=1).max() < 1e-12
    assert mesh.mark_names == tuple(mark.name for mark in outline.marks)
    for vertex, mark in zip(mesh.mark_vertices, outline.marks, strict=True):
        np.testing.assert_allclose(mesh.points[vertex], mark.at, atol=1e-15)


DISC = Outline.circle((0, 0), radius=1.0)
ON_RIM = (math.cos(1), math.sin(1))
LEFT = PLATE.zone(boxed(0, 0, 0.5, 1), name="left")
PARTS = {
    "a zone on three sides": LEFT,
    "zones with a common edge": LEFT.zone(boxed(0.5, 0, 1, 0.3), name="low"),
    "zones all over": LEFT.zone(boxed(0.5, 0, 1, 1), name="right"),
    "a zone all over": PLATE.zone(boxed(0, 0, 1, 1), name="all"),
    "a round zone": PLATE.zone(
        Circle(centre=(0.5, 0.5), radius=0.2, name="edge"), name="pad"
    ),
    "a collar": HOLED.zone(
        Circle(centre=(0.4, 0.5), radius=0.2, name="edge"), name="collar"
    ),
    "a zone cut by a hole": HOLED.zone(boxed(0.4, 0.2, 0.9, 0.8), name="part"),
    "a zone on the edge of a hole": PLATE.cut(
        Polygon(points=0.4 + 0.2 * SQUARE, sides=["hole"] * 4)
    ).zone(boxed(0.6, 0.4, 0.8, 0.6), name="next"),
    "half a disc": DISC.zone(
        Polygon(points=[(0, -1), (0, 1)], sides=["a", "b"], bulges=[1, 0]), name="half"
    ),
    "a segment of rounded numbers": DISC.zone(
        Polygon(
            points=[(0.540302, -0.841471), (0.540302, 0.841471)],
            sides=["a", "b"],
            bulges=[0.5462, 0],  # tan(1/2) is 0.5463
        ),
        name="segment",
    ),
    "a zone nearly on a side": PLATE.zone(boxed(0.2, 3e-5, 0.6, 0.4), name="rib"),
    "a zone past a bend of a side": Outline.polygon(
        [(0, 0), (0.5, -5e-5), (1, 0), (1, 1), (0, 1)]
    ).zone(boxed(0, 0, 1, 0.4), name="rib"),
    "a zone past a hardly visible bend": Outline.of(
        Polygon(
            points=[(0, 0), (0.5, -5e-7), (1, 0), (1, 1), (0, 1)],
            sides=["s", "s", *SIDES[1:]],
            snap=0.0,
        )
    ).zone(boxed(0, 0, 1, 0.4), name="rib"),
    "a seam from side to side": PLATE.seam([(0, 0.3), (1, 0.7)], name="weld"),
    "seams that cross": PLATE.seam([(0, 0.3), (1, 0.7)], name="weld").seam(
        [(0.2, 0), (0.7, 1)], name="other"
    ),
    "seams that end inside": PLATE.seam([(0.2, 0.3), (0.5, 0.6), (0.8, 0.4)], name="w"),
    "a seam that closes": PLATE.seam(
        [(0.2, 0.3), (0.5, 0.6), (0.8, 0.4), (0.2, 0.3)], name="ring"
    ),
    "a seam from a corner": PLATE.seam([(0, 0), (0.5, 0.6)], name="weld"),
    "a bent seam": PLATE.seam([(0.2, 0.3), (0.8, 0.3)], bulges=[0.7], name="bend"),
    "a seam along a side": PLATE.seam([(0.2, 0), (0.8, 0)], name="weld"),
    "a seam along seams": PLATE.seam([(0.2, 0.5), (0.8, 0.5)], name="one").seam(
        [(0.4, 0.5), (1, 0.5)], name="two"
    ),
    "a seam to a hole": HOLED.seam([(0, 0.5), (0.3, 0.5)], name="weld"),
    "a seam from rim to rim": DISC.seam(
        [ON_RIM, (-ON_RIM[0], -ON_RIM[1])], name="weld"
    ),
    "a seam across zones": LEFT.seam([(0.1, 0.5), (0.9, 0.6)], name="weld"),
    "marks": PLATE.mark((0.3, 0.3), name="in")
    .mark((0.5, 0), name="on")
    .mark((0, 0), name="at"),
    "marks on lines": LEFT.seam([(0.2, 0.5), (0.8, 0.5)], name="weld")
    .mark((0.3, 0.5), name="seam")
    .mark((0.2, 0.5), name="end")
    .mark((0.5, 0.25), name="edge")
    .mark((0.5, 0.5), name="cross"),
    "a mark on a rim": DISC.mark(ON_RIM, name="post"),
}


@pytest.mark.parametrize("name", PARTS)
def test_zones_seams_and_marks_are_parts_of_one_mesh(name):
    mesh = mesh_outline(PARTS[name], size=0.08)
    assert_fits(mesh, PARTS[name])
    assert_parts(mesh, PARTS[name])
    assert corner_angles(mesh).min() > 20.0


@pytest.mark.parametrize("scale", [1e-2, 1e2])
def test_parts_are_kept_at_any_scale_and_place(scale):
    """Gmsh's own tolerance is a length: 1e-7 of whatever unit."""
    here = np.array([1e3, 7e2]) * scale
    outline = (
        Outline.polygon(here + scale * SQUARE, sides=SIDES)
        .cut(Circle(centre=tuple(here + 0.5 * scale), radius=0.1 * scale, name="shaft"))
        .zone(
            Polygon(points=here + scale * 0.3 * SQUARE, sides=["edge"] * 4), name="pad"
        )
        .seam(here + scale * np.array([(0.3, 0.3), (1.0, 0.1)]), name="weld")
        .mark(tuple(here + scale * np.array([0.8, 0.8])), name="post")
    )
    mesh = mesh_outline(outline, size=0.08 * scale)
    pad = mesh.areas[mesh.zones == 1].sum()
    assert pad == pytest.approx(0.09 * scale**2, rel=1e-9)
    ends = mesh.points[mesh.seam_edges]
    length = np.hypot(*(ends[:, 1] - ends[:, 0]).T).sum()
    assert length == pytest.approx(math.hypot(0.7, 0.2) * scale, rel=1e-9)
    np.testing.assert_allclose(mesh.points[mesh.mark_vertices[0]], outline.marks[0].at)
    assert corner_angles(mesh).min() > 20.0


@st.composite
def furnished(draw):
    """A square with a zone, two seams and a mark anywhere on a grid of tenths."""
    tenths = st.integers(0, 10).map(lambda k: k / 10)
    x = sorted(draw(st.lists(tenths, min_size=2, max_size=2, unique=True)))
    y = sorted(draw(st.lists(tenths, min_size=2, max_size=2, unique=True)))
    outline = PLATE.zone(boxed(x[0], y[0], x[1], y[1]), name="zone")
    for name in ("one", "two"):
        ends = draw(
            st.lists(st.tuples(tenths, tenths), min_size=2, max_size=2, unique=True)
        )
        outline = outline.seam(ends, name=name)
    return outline.mark(draw(st.tuples(tenths, tenths)), name="post")


@settings(max_examples=25)
@given(furnished())
def test_any_zone_seams_and_mark_make_one_mesh(outline):
    mesh = mesh_outline(outline, size=0.1)
    assert_fits(mesh, outline)
    assert_parts(mesh, outline)
