"""Bisection keeps what a mesh knows, and puts new points where they belong."""

import numpy as np
import oracles
import pytest
from hypothesis import given
from hypothesis import strategies as st
from plates import grid

from kplate.errors import InputError
from kplate.loads import Case, Pressure
from kplate.materials import STEEL
from kplate.mesh import STRAIGHT_EDGE
from kplate.meshing import mesh_outline
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.refine import refined
from kplate.shapes import Circle, Rectangle, Slot
from kplate.solve.static import solve_static
from kplate.supports import CLAMPED


def smallest_angle(mesh):
    corners = mesh.points[mesh.triangles]
    u = np.roll(corners, -1, axis=1) - corners
    v = np.roll(corners, 1, axis=1) - corners
    cosine = np.einsum("nvc,nvc->nv", u, v)
    cosine /= np.linalg.norm(u, axis=2) * np.linalg.norm(v, axis=2)
    return np.degrees(np.arccos(cosine).min())


@pytest.fixture(scope="module")
def cover():
    """Everything a mesh may know at once."""
    outline = (
        Outline.of(Rectangle(centre=(0, 0), size=(2, 1), corner_radius=0.2, name="rim"))
        .cut(Circle(centre=(-0.5, 0.0), radius=0.15, name="hole"))
        .cut(Slot(centre=(0.5, 0.1), length=0.4, width=0.1, name="slot", angle=0.4))
        .zone(Rectangle(centre=(0.3, -0.3), size=(0.4, 0.2), name="z"), name="pad")
        .seam([(-0.1, -0.5), (-0.1, 0.5)], name="rib")
        .mark((0.75, -0.1), name="post")
    )
    return mesh_outline(outline, size=0.15)


@given(st.integers(0, 10_000))
def test_any_marking_gives_a_sound_mesh_that_keeps_what_it_knew(cover, seed):
    """`Mesh` itself checks areas, cracks, sides, seams and marks."""
    rng = np.random.default_rng(seed)
    mesh = cover
    for _ in range(3):
        marked = rng.random(len(mesh.triangles)) < 0.2
        finer = refined(mesh, marked)
        assert len(finer.triangles) > len(mesh.triangles) or not marked.any()
        for number in range(len(mesh.side_names)):
            straight = (mesh.boundary_sides == number) & (mesh.boundary_circles < 0)
            after = (finer.boundary_sides == number) & (finer.boundary_circles < 0)
            assert finer.boundary_lengths[after].sum() == pytest.approx(
                mesh.boundary_lengths[straight].sum()
            )
        pad = mesh.zone_names.index("pad")
        assert finer.areas[finer.zones == pad].sum() == pytest.approx(0.08)
        ends = finer.points[finer.seam_edges]
        assert np.abs(ends[..., 0] + 0.1).max() < 1e-12
        lengths = np.hypot(*(ends[:, 1] - ends[:, 0]).T)
        assert lengths.sum() == pytest.approx(1.0)
        np.testing.assert_array_equal(finer.mark_vertices, mesh.mark_vertices)
        mesh = finer
    assert smallest_angle(mesh) > 0.4 * smallest_angle(cover)


def test_new_points_of_curved_sides_lie_on_their_circles(cover):
    mesh = cover
    for _ in range(4):
        mesh = refined(mesh, np.ones(len(mesh.triangles), dtype=bool))
    curved = mesh.boundary_circles != STRAIGHT_EDGE
    circles = mesh.circles[mesh.boundary_circles[curved]]
    for end in (0, 1):
        arms = mesh.points[mesh.boundary_edges[curved, end]] - circles[:, :2]
        np.testing.assert_allclose(np.hypot(*arms.T), circles[:, 2], rtol=1e-12)
    exact = 2 - (4 - np.pi) * 0.2**2 - np.pi * 0.15**2
    exact -= 0.3 * 0.1 + np.pi * 0.05**2
    assert abs(mesh.area - exact) < 0.01 * abs(cover.area - exact) + 2e-5


def test_only_what_is_needed_is_parted():
    mesh = grid(8)
    marked = np.zeros(len(mesh.triangles), dtype=bool)
    np.testing.assert_array_equal(refined(mesh, marked).points, mesh.points)
    marked[5] = True
    finer = refined(mesh, marked)
    assert len(mesh.triangles) < len(finer.triangles) <= len(mesh.triangles) + 4


def test_all_triangles_halve():
    mesh = grid(4)
    finer = refined(mesh, np.ones(len(mesh.triangles), dtype=bool))
    np.testing.assert_allclose(finer.areas, mesh.areas.max() / 2, rtol=1e-12)
    assert len(finer.triangles) == 2 * len(mesh.triangles)


def test_a_round_plate_converges_under_refinement():
    """Clamped disc, p a^4 / 64 D: second order in the size, rim points on the rim."""
    outline = Outline.circle((0.0, 0.0), radius=1.0)
    plate = Plate(
        outline=outline, thickness=0.01, material=STEEL, supports={"rim": CLAMPED}
    )
    D = STEEL.bending_stiffness(0.01)
    exact = float(oracles.disc([0.0], 1.0, "clamped", pressure=1.0, rigidity=D).w[0])
    mesh, error = mesh_outline(outline, size=0.15), []
    for _ in range(3):
        state = solve_static(plate, mesh, [Case(name="p", loads=[Pressure(1.0)])])
        w = state.constraints.numbering.by_vertex(state.unknowns)[:, 0, 0].max()
        error.append(abs(w / exact - 1.0))
        for _ in range(2):  # two bisections halve the size
            mesh = refined(mesh, np.ones(len(mesh.triangles), dtype=bool))
    assert error[-1] < 0.1 * error[0]
    assert error[-1] < 0.002


def test_a_marking_that_names_no_triangles_is_refused():
    with pytest.raises(InputError) as caught:
        refined(grid(2), [True, False])
    assert str(caught.value) == (
        "marked has shape (2,) and type bool; give one True or False for each of 8 "
        "triangles."
    )
    with pytest.raises(InputError, match="and type int64; give one True or False"):
        refined(grid(2), np.zeros(8, dtype=np.int64))
