"""Meshes: what is refused, edges and joints, tangents, and finding points."""

import math
import pickle
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from plates import grid

from kplate.errors import InputError, MeshError
from kplate.mesh import STRAIGHT_EDGE, Mesh

SQUARE = {
    "points": [(0, 0), (1, 0), (1, 1), (0, 1)],
    "triangles": [(0, 1, 2), (0, 2, 3)],
    "boundary_edges": [(0, 1), (1, 2), (2, 3), (3, 0)],
    "boundary_sides": [0, 1, 2, 3],
    "side_names": ("south", "east", "north", "west"),
}


def square(**changes):
    return Mesh(**{**SQUARE, **changes})


def ring(n, radii, centre=(0.0, 0.0)):
    """An annulus of n sectors with rings of vertices at some radii, rim and hole."""
    angle = 2.0 * np.pi * np.arange(n) / n
    unit = np.c_[np.cos(angle), np.sin(angle)]
    number = np.arange(n * len(radii)).reshape(len(radii), n)
    p, q = number[:-1], number[1:]
    r, s = np.roll(q, -1, axis=1), np.roll(p, -1, axis=1)
    triangles = np.vstack(
        [np.c_[a.ravel(), b.ravel(), c.ravel()] for a, b, c in ((p, q, r), (p, r, s))]
    )
    rim = np.c_[number[-1], np.roll(number[-1], -1)]
    hole = np.c_[np.roll(number[0], -1), number[0]]
    return Mesh(
        points=np.vstack([radius * unit for radius in radii]) + centre,
        triangles=triangles,
        boundary_edges=np.vstack([rim, hole]),
        boundary_sides=np.repeat([0, 1], n),
        side_names=("rim", "hole"),
        boundary_circles=np.repeat([0, 1], n),
        circles=[(*centre, radii[-1]), (*centre, radii[0])],
    )


def refusal(build, error=MeshError):
    with pytest.raises(error) as caught:
        build()
    return str(caught.value)


# What is refused


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"triangles": []}, "the mesh has no triangles."),
        (
            {"points": [(0, 0, 0)] * 4},
            "points has shape (4, 3); it must have (4, 2).",
        ),
        (
            {"points": [(0, 0), (1, 0), (1, math.nan), (0, 1)]},
            "points holds nan; it takes numbers from -inf to below inf.",
        ),
        (
            {"triangles": [(0, 1, 2, 3)]},
            "triangles has shape (1, 4); it must have (1, 3).",
        ),
        (
            {"triangles": [(0, 1, 2), (0, 2, 4)]},
            "triangles holds 4; it takes numbers from 0 to below 4.",
        ),
        (
            {"triangles": [(0, 1, 2), (0, 2, -1)]},
            "triangles holds -1; it takes numbers from 0 to below 4.",
        ),
        (
            {"boundary_edges": [(0, 1, 2)]},
            "boundary_edges has shape (1, 3); it must have (1, 2).",
        ),
        (
            {"boundary_edges": [(0, 1), (1, 2), (2, 3), (3, 7)]},
            "boundary_edges holds 7; it takes numbers from 0 to below 4.",
        ),
        (
            {"boundary_sides": [0, 1, 2]},
            "boundary_sides has shape (3,); it must have (4,).",
        ),
        (
            {"boundary_sides": [0, 1, 2, 4]},
            "boundary_sides holds 4; it takes numbers from 0 to below 4.",
        ),
        (
            {"boundary_circles": [0, -1, -1, -1]},
            "boundary_circles holds 0; it takes numbers from -1 to below 0.",
        ),
        (
            {"boundary_circles": [-1, -1]},
            "boundary_circles has shape (2,); it must have (4,).",
        ),
        ({"zones": [0]}, "zones has shape (1,); it must have (2,)."),
        (
            {"triangles": [(0, 1, 2), (0, 3, 2)]},
            "triangle 1 near (0.333333, 0.666667) m has area -0.5 m2 (1 such of 2); "
            "list the vertices of each triangle counter-clockwise.",
        ),
        (
            {"points": [(0, 0), (1, 0), (2, 0), (0, 1)]},
            "triangle 0 near (1, 0) m has area 0 m2 (1 such of 2); list the vertices "
            "of each triangle counter-clockwise.",
        ),
        (
            {"points": [*SQUARE["points"], (0.25, 0.5)]},
            "point 4 at (0.25, 0.5) m belongs to no triangle; drop it.",
        ),
        (
            {"triangles": [(0, 1, 2), (0, 2, 3), (0, 1, 3)]},
            "two triangles lie on the same side of their edge at (0.5, 0) m: they "
            "overlap; mesh again.",
        ),
        (
            {"triangles": [(0, 1, 2), (0, 2, 3), (0, 1, 2)]},
            "two triangles lie on the same side of their edge at (0.5, 0) m: they "
            "overlap; mesh again.",
        ),
        (
            {"boundary_edges": [(0, 1), (1, 2), (2, 3)], "boundary_sides": [0, 1, 2]},
            "4 edges belong to one triangle only but 3 edges lie on sides: the mesh is "
            "cracked or a side is not named.",
        ),
        (
            {"boundary_edges": [(0, 1), (1, 2), (2, 3), (0, 2)]},
            "4 edges belong to one triangle only but 4 edges lie on sides: the mesh is "
            "cracked or a side is not named.",
        ),
        (
            {"boundary_edges": [(0, 1), (2, 1), (2, 3), (0, 3)]},
            "boundary edge 1 runs with the plate on its right (2 such of 4); turn it "
            "round.",
        ),
    ],
)
def test_a_mesh_that_cannot_be_is_refused(changes, words):
    assert refusal(lambda: square(**changes)) == words


def test_a_cracked_mesh_is_refused():
    """Two triangles that lie side by side without a common edge."""
    points = [(0, 0), (1, 0), (1, 1), (0, 0), (1, 1), (0, 1)]
    cracked = {
        "points": points,
        "triangles": [(0, 1, 2), (3, 4, 5)],
        "boundary_edges": [(0, 1), (1, 2), (4, 5), (5, 3)],
    }
    assert refusal(lambda: square(**cracked)) == (
        "6 edges belong to one triangle only but 4 edges lie on sides: the mesh is "
        "cracked or a side is not named."
    )


def test_a_plate_pinched_to_a_point_is_refused():
    points = [(0, 0), (1, 0), (0, 1), (-1, 0), (0, -1)]
    edges = [(0, 1), (1, 2), (2, 0), (0, 3), (3, 4), (4, 0)]
    bow = {
        "points": points,
        "triangles": [(0, 1, 2), (0, 3, 4)],
        "boundary_edges": edges,
        "boundary_sides": [0] * 6,
        "side_names": ("rim",),
    }
    assert refusal(lambda: Mesh(**bow)) == (
        "the plate is pinched to a point at (0, 0) m; part it."
    )


# Arrays


def test_what_is_left_out_is_straight_and_of_one_zone():
    mesh = square()
    assert mesh.boundary_circles.tolist() == [STRAIGHT_EDGE] * 4
    assert mesh.zones.tolist() == [0, 0]
    assert mesh.circles.shape == (0, 3)
    assert mesh.zone_names == ("plate",)
    assert mesh.seam_edges.shape == (0, 2)
    assert mesh.seam_numbers.shape == mesh.mark_vertices.shape == (0,)


def test_zones_seams_and_marks_are_parts_of_the_mesh():
    parts = {
        "zones": [0, 1],
        "zone_names": ("plate", "rib"),
        "seam_edges": [(2, 0)],
        "seam_numbers": [0],
        "seam_names": ("weld",),
        "mark_vertices": [3],
        "mark_names": ("post",),
    }
    mesh = square(**parts)
    assert mesh.zones.tolist() == [0, 1]
    assert mesh.seam_edges.tolist() == [[2, 0]]
    assert mesh.mark_vertices.tolist() == [3]
    for wrong, words in (
        ({"zones": [0, 2]}, "a triangle belongs to no named zone."),
        (
            {"seam_edges": [(1, 3)]},
            "a seam is not made of edges of triangles; mesh again.",
        ),
        ({"seam_numbers": []}, "each seam edge needs the number of its seam."),
        ({"mark_vertices": [4]}, "a mark is not a vertex of the mesh; mesh again."),
        ({"mark_vertices": []}, "a mark is not a vertex of the mesh; mesh again."),
    ):
        assert refusal(lambda wrong=wrong: square(**{**parts, **wrong})) == words


def test_arrays_are_copied_and_read_only():
    points = np.array(SQUARE["points"], dtype=float)
    mesh = square(points=points)
    points[0] = 9.0
    assert mesh.points[0].tolist() == [0.0, 0.0]
    for name in ("points", "triangles", "boundary_edges", "boundary_sides", "circles"):
        assert not getattr(mesh, name).flags.writeable, name


def test_areas_add_up():
    mesh = grid(3, m=5, a=2.0, b=0.5)
    np.testing.assert_allclose(mesh.areas, 1.0 / 30.0)
    assert mesh.area == pytest.approx(1.0, rel=1e-15)
    inscribed = 0.5 * 24 * math.sin(2 * math.pi / 24)  # times r^2: a regular 24-gon
    assert ring(24, (0.5, 0.8, 2.0)).area == pytest.approx(inscribed * (4 - 0.25))


def test_a_mesh_survives_a_copy_to_another_process():
    mesh = ring(12, (0.5, 1.0))
    assert mesh.covers([(0.7, 0.0)])[0]  # fills what is cached
    copy = pickle.loads(pickle.dumps(mesh))
    assert copy.covers([(0.7, 0.0), (0.0, 0.0)]).tolist() == [True, False]


# Edges and joints


@pytest.mark.parametrize(
    ("mesh", "holes"), [(square(), 0), (grid(4, m=3), 0), (ring(9, (1, 2, 3)), 1)]
)
def test_edges_are_numbered_as_euler_counts_them(mesh, holes):
    edges = mesh.edges
    assert len(mesh.points) - len(edges) + len(mesh.triangles) == 1 - holes
    assert (edges[:, 0] < edges[:, 1]).all()
    key = edges @ [len(mesh.points), 1]
    assert (np.diff(key) > 0).all()


@pytest.mark.parametrize("mesh", [square(), grid(4, m=3), ring(9, (1, 2, 3))])
def test_an_edge_lies_opposite_the_vertex_of_its_number(mesh):
    for k in range(3):
        ends = np.delete(mesh.triangles, k, axis=1)
        own = mesh.edges[mesh.triangle_edges[:, k]]
        np.testing.assert_array_equal(np.sort(ends, axis=1), own)


def test_boundary_lengths_are_those_of_the_chords():
    mesh = ring(12, (1.0, 2.0), centre=(5.0, -3.0))
    chord = 2.0 * math.sin(math.pi / 12)
    np.testing.assert_allclose(mesh.boundary_lengths, np.repeat([2, 1], 12) * chord)


@pytest.mark.parametrize(
    ("mesh", "loops"), [(square(), 1), (grid(4, m=3), 1), (ring(9, (1, 2, 3)), 2)]
)
def test_boundary_joints_close_up(mesh, loops):
    """Following them from edge to edge goes once round each closed line."""
    joints, edges = mesh.boundary_joints, mesh.boundary_edges
    np.testing.assert_array_equal(joints[:, 0], np.arange(len(edges)))
    np.testing.assert_array_equal(edges[joints[:, 0], 1], edges[joints[:, 1], 0])
    left, found = set(range(len(edges))), 0
    while left:
        edge, found = left.pop(), found + 1
        start = edge
        while (edge := int(joints[edge, 1])) != start:
            left.remove(edge)
    assert found == loops


def test_joints_do_not_depend_on_the_order_of_the_edges():
    mesh = ring(9, (1, 2, 3))
    order = np.random.default_rng(3).permutation(18)
    names = ("boundary_edges", "boundary_sides", "boundary_circles")
    mixed = replace(mesh, **{name: getattr(mesh, name)[order] for name in names})
    edges, joints = mixed.boundary_edges, mixed.boundary_joints
    np.testing.assert_array_equal(edges[joints[:, 0], 1], edges[joints[:, 1], 0])


# Tangents


def test_straight_edges_are_their_own_tangents():
    mesh = grid(2, a=3.0)
    edges = np.arange(8)
    expected = np.repeat([(1, 0), (0, 1), (-1, 0), (0, -1)], 2, axis=0)
    for end in (0, 1):
        found = mesh.tangents(edges, mesh.boundary_edges[:, end])
        np.testing.assert_array_equal(found, expected)


def test_chords_take_the_tangent_of_their_circle():
    """Exactly: square to the radius, the plate on the left, at either end."""
    centre = np.array([5.0, -3.0])
    mesh = ring(7, (1.0, 2.5), centre=centre)
    edges = np.arange(14)
    for end in (0, 1):
        at = mesh.boundary_edges[:, end]
        arm = mesh.points[at] - centre
        left = np.c_[-arm[:, 1], arm[:, 0]] / np.hypot(*arm.T)[:, None]
        left[7:] *= -1.0  # around the hole the other way
        np.testing.assert_allclose(mesh.tangents(edges, at), left, atol=1e-15)


def test_tangents_are_given_in_the_order_asked_for():
    mesh = ring(7, (1.0, 2.5))
    edges = np.array([9, 2, 2, 13])
    at = mesh.boundary_edges[edges, [0, 1, 0, 1]]
    one_by_one = [mesh.tangents(edges[[i]], at[[i]])[0] for i in range(4)]
    np.testing.assert_array_equal(mesh.tangents(edges, at), one_by_one)


# Finding points


def assert_found(mesh, points):
    """Located where the barycentrics say they are."""
    triangles, barycentrics = mesh.locate(points)
    vertices = mesh.points[mesh.triangles[triangles]]
    np.testing.assert_allclose(
        np.einsum("kv,kvc->kc", barycentrics, vertices), points, atol=1e-12
    )
    np.testing.assert_allclose(barycentrics.sum(axis=1), 1.0)
    assert mesh.covers(points).all()
    return barycentrics


@given(st.lists(st.tuples(st.floats(0, 2), st.floats(0, 0.5)), min_size=1, max_size=9))
def test_any_point_of_a_plate_is_found(points):
    assert assert_found(grid(3, m=2, a=2.0, b=0.5), points).min() > -1e-9


@pytest.mark.parametrize("scale", [1e-3, 1.0, 1e3])
def test_vertices_and_points_on_edges_are_found(scale):
    mesh = ring(9, scale * np.array([1.0, 2.0, 3.0]))
    middles = mesh.points[mesh.edges].mean(axis=1)
    for points in (mesh.points, middles):
        _, barycentrics = mesh.locate(points)
        assert barycentrics.min() > -1e-12
        hollow = np.hypot(*points.T) < scale * (1.0 - 1e-9)  # beyond the inner rim
        np.testing.assert_array_equal(mesh.covers(points), ~hollow)
    on_edge = np.sort(mesh.locate(middles)[1], axis=1)
    np.testing.assert_allclose(on_edge, [[0, 0.5, 0.5]] * len(middles), atol=1e-12)


def test_a_vertex_of_a_triangle_is_one_in_its_barycentrics():
    mesh = grid(3)
    _, barycentrics = mesh.locate(mesh.points)
    np.testing.assert_allclose(
        np.sort(barycentrics, axis=1), [[0, 0, 1]] * len(mesh.points), atol=1e-12
    )


@pytest.mark.parametrize("inner", [0.3, 0.9, 0.999])
@pytest.mark.parametrize("n", [7, 48])
def test_the_sliver_behind_a_chord_of_a_round_rim_is_plate(n, inner):
    """Up to the circle and no farther, however flat the triangle of the chord is."""
    mesh = ring(n, (2.0 * inner, 2.0), centre=(5.0, -3.0))
    angle = np.linspace(0.0, 2.0 * np.pi, 1009)
    unit = np.c_[np.cos(angle), np.sin(angle)]
    centre = np.array([5.0, -3.0])
    assert_found(mesh, centre + 2.0 * unit)
    off_middle = angle % (2 * math.pi / n) - math.pi / n
    chord = 2.0 * math.cos(math.pi / n) / np.cos(off_middle)
    assert_found(mesh, centre + (0.5 * (chord + 2.0))[:, None] * unit)
    assert not mesh.covers(centre + (2.0 + 1e-6) * unit).any()


def test_a_point_behind_a_chord_goes_to_the_triangle_of_the_chord():
    mesh = ring(8, (1.0, 2.0))
    angle = 2 * np.pi * (np.arange(8) + 0.5) / 8
    triangles, _ = mesh.locate(1.99 * np.c_[np.cos(angle), np.sin(angle)])
    for k in range(8):
        assert set(mesh.boundary_edges[k]) <= set(mesh.triangles[triangles[k]])


def test_holes_are_no_plate():
    """Nor is the space between their chords and the rim, though in a triangle."""
    mesh = ring(12, (1.0, 2.0))
    angle = 2 * np.pi * (np.arange(12) + 0.5) / 12
    unit = np.c_[np.cos(angle), np.sin(angle)]
    chord = math.cos(math.pi / 12)
    assert not mesh.covers((chord - 1e-6) * unit).any()
    assert not mesh.covers((chord + 1e-6) * unit).any()
    mesh.locate((chord + 1e-6) * unit)  # behind the chord is a triangle
    assert mesh.covers((1.0 + 1e-6) * unit).all()
    assert not mesh.covers([(0.0, 0.0)])[0]


def test_a_round_hole_does_not_widen_the_straight_sides():
    """A point 1 mm off the plate is off it, wide as the slivers of the hole may be."""
    mesh = square(
        points=[*SQUARE["points"], (0.5, 0.3), (0.7, 0.6), (0.3, 0.6)],
        triangles=[
            (0, 1, 4),
            (1, 5, 4),
            (1, 2, 5),
            (2, 6, 5),
            (2, 3, 6),
            (3, 0, 6),
            (0, 4, 6),
        ],
        boundary_edges=[*SQUARE["boundary_edges"], (5, 4), (6, 5), (4, 6)],
        boundary_sides=[0, 1, 2, 3, 4, 4, 4],
        side_names=(*SQUARE["side_names"], "hole"),
        boundary_circles=[-1, -1, -1, -1, 0, 0, 0],
        circles=[(0.5, 0.5125, 0.2125)],
    )
    off = [(0.5, -1e-3), (1.001, 0.5), (0.5, 1.001), (-1e-3, 0.5), (1.0007, 1.0007)]
    assert not mesh.covers(off).any()


@pytest.mark.parametrize("scale", [1e-4, 1.0, 1e4])
def test_round_off_beside_the_plate_is_forgiven(scale):
    mesh = grid(3, a=scale, b=scale)
    assert mesh.covers(scale * np.array([(-1e-12, 0.5), (0.5, 1 + 1e-12)])).all()
    assert not mesh.covers(scale * np.array([(-1e-7, 0.5), (0.5, 1 + 1e-7)])).any()


def test_a_point_off_the_plate_is_refused_by_its_coordinates():
    mesh = ring(12, (1.0, 2.0))
    words = "m is not on the plate; it lies outside the outline or in a hole."
    points = [(1.5, 0.0), (0.25, 0.0), (3.0, 0.0)]
    assert (
        refusal(lambda: mesh.locate(points), InputError) == f"point (0.25, 0) {words}"
    )
    assert refusal(lambda: mesh.locate((3, 4)), InputError) == f"point (3, 4) {words}"
    assert mesh.covers(points).tolist() == [True, False, False]


@pytest.mark.parametrize(
    ("points", "words"),
    [
        (
            [(0, 0, 0)],
            "points have shape (1, 3) or are not finite; give pairs (x, y) in m.",
        ),
        (
            [(0, math.nan)],
            "points have shape (1, 2) or are not finite; give pairs (x, y) in m.",
        ),
        (0.5, "points have shape (1, 1) or are not finite; give pairs (x, y) in m."),
        ("here", "points are 'here'; give pairs (x, y) in m."),
        ([(0, 0), (1,)], "points are [(0, 0), (1,)]; give pairs (x, y) in m."),
        (None, "points have shape (1, 1) or are not finite; give pairs (x, y) in m."),
    ],
)
def test_what_is_no_point_is_refused(points, words):
    assert refusal(lambda: square().locate(points), InputError) == words
    assert refusal(lambda: square().covers(points), InputError) == words


def test_no_points_are_found_at_no_places():
    triangles, barycentrics = square().locate(np.zeros((0, 2)))
    assert triangles.shape == (0,)
    assert barycentrics.shape == (0, 3)


@given(st.integers(0, 11), st.floats(-2, 2), st.floats(-2, 2))
def test_barycentrics_of_a_given_triangle_reach_beyond_it(triangle, x, y):
    mesh = grid(3, m=2)
    found = mesh.barycentrics(np.array([triangle]), np.array([[x, y]]))
    vertices = mesh.points[mesh.triangles[triangle]]
    np.testing.assert_allclose(found[0] @ vertices, (x, y), atol=1e-12)
    assert found.sum() == pytest.approx(1.0)
