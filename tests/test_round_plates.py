"""Plates with true arcs against closed forms: fields, reactions, balance.

Discs under an even pressure are quartics, so that the quintic has them to round-off,
whatever the mesh. Sources as in oracles_round.py.
"""

import math
from functools import cache

import numpy as np
import oracles_round
import pytest
from numpy.testing import assert_allclose
from oracles_series import CLAMPED, FREE, SIMPLY_SUPPORTED
from plates import unit_material

from kplate import supports
from kplate.basis import Basis
from kplate.errors import InputError, MeshError
from kplate.loads import (
    Case,
    EdgeMoment,
    Hydrostatic,
    LineForce,
    PointForce,
    Pressure,
)
from kplate.meshing import mesh_outline
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.roundedges import fitted, round_edges
from kplate.shapes import Circle, Rectangle, Slot
from kplate.solution import Solution
from kplate.solve.static import solve_static

D, NU = 1e4, 0.3
SUPPORTS = {
    CLAMPED: supports.CLAMPED,
    SIMPLY_SUPPORTED: supports.SIMPLY_SUPPORTED,
    FREE: supports.FREE,
}
HELD = (CLAMPED, SIMPLY_SUPPORTED)
PAIRS = [(a, b) for a in SUPPORTS for b in SUPPORTS if (a, b) != (FREE, FREE)]
P, F, M = -1e3, 300.0, 100.0  # Pa, N/m, N
RADII = (0.4, 1.0)
ANGLES = np.array([0.1, 1.2, 2.9, 4.0, 5.5])


def plate(outline, held):
    return Plate(
        outline=outline, thickness=0.01, material=unit_material(NU, D=D), supports=held
    )


def solution(stated, *loads, size=0.35, around=12):
    mesh = fitted(mesh_outline(stated.outline, size=size, around=around))
    case = Case(name="load", loads=loads)
    return Solution(state=solve_static(stated, mesh, [case], element="quintic"))


@cache
def disc(support, *loads, radius=1.0):
    outline = Outline.circle((0.0, 0.0), radius=radius)
    return solution(plate(outline, {"rim": SUPPORTS[support]}), *loads)


@cache
def ring(inner, outer):
    """A ring under pressure, with forces on free rims and moments where they turn."""
    hole = Circle(centre=(0.0, 0.0), radius=RADII[0], name="hole")
    outline = Outline.circle((0.0, 0.0), radius=RADII[1]).cut(hole)
    pair = {"hole": inner, "rim": outer}
    loads = [Pressure(P)]
    loads += [LineForce(force=F, along=n) for n, s in pair.items() if s == FREE]
    loads += [EdgeMoment(moment=M, along=n) for n, s in pair.items() if s != CLAMPED]
    held = {name: SUPPORTS[support] for name, support in pair.items()}
    return solution(plate(outline, held), *loads, around=16)


def exact_ring(r, inner, outer):
    return oracles_round.annulus(
        r, RADII, (inner, outer), pressure=P, forces=(F, F), moments=(M, M), rigidity=D
    )


def polar(r, angles=ANGLES):
    return np.column_stack([r * np.cos(angles), r * np.sin(angles)])


def radial(moments, points):
    """m_rr, m_tt and m_rt of moments (k, 3) at points (k, 2)."""
    c, s = (points / np.hypot(*points.T)[:, None]).T
    xx, yy, xy = moments.T
    mixed = 2.0 * xy * c * s
    return (
        xx * c * c + yy * s * s + mixed,
        xx * s * s + yy * c * c - mixed,
        (yy - xx) * c * s + xy * (c * c - s * s),
    )


# Discs: exact.


@pytest.mark.parametrize("support", HELD)
def test_a_disc_under_pressure_is_exact(support):
    found = disc(support, Pressure(P))
    r = np.array([0.05, 0.3, 0.6, 0.9, 1.0])
    exact = oracles_round.disc(r, 1.0, support, pressure=P, rigidity=D)
    size = abs(P) / D
    points = polar(r)
    assert_allclose(found.deflection(points), exact.w, atol=1e-10 * size)
    m_rr, m_tt, m_rt = radial(found.moments(points), points)
    assert_allclose(m_rr, exact.m_rr, atol=1e-8 * abs(P))
    assert_allclose(m_tt, exact.m_tt, atol=1e-8 * abs(P))
    assert_allclose(m_rt, 0.0, atol=1e-8 * abs(P))


@pytest.mark.parametrize("support", HELD)
def test_the_reaction_of_a_disc_is_exact_along_its_rim(support):
    found = disc(support, Pressure(P)).reactions()
    (rim,) = found.sides
    assert_allclose(rim.line_reaction, -P / 2.0, rtol=1e-8)
    clamping = P / 8.0 if support == CLAMPED else 0.0
    assert_allclose(rim.line_moment, clamping, atol=1e-8 * abs(P))
    assert rim.resultant.force == pytest.approx(-P * math.pi, rel=1e-11)
    assert_allclose(np.hypot(*rim.stations.T), 1.0, rtol=1e-12)
    assert rim.distance[-1] == pytest.approx(2.0 * math.pi, rel=1e-12)
    assert found.imbalance < 1e-12


def tilted(support, points):
    """W (k,) and the rim's v_n at angle 0 of a unit disc under p = x, D = 1.

    ``w = x (A + B r^2 + r^4) / 192`` has ``lap lap w = x``; A and B from the rim.
    """
    # Of cos times r, r^3, r^5 at r = 1: w, w' and m_rr = w'' + nu (w' - w).
    rows = {
        CLAMPED: [[1.0, 1.0, 1.0], [1.0, 3.0, 5.0]],
        SIMPLY_SUPPORTED: [[1.0, 1.0, 1.0], [0.0, 6.0 + 2 * NU, 20.0 + 4 * NU]],
    }[support]
    rows = np.array(rows)
    A, B = np.linalg.solve(rows[:, :2], -rows[:, 2])
    r2 = np.sum(points**2, axis=1)
    w = points[:, 0] * (A + B * r2 + r2**2) / 192.0
    # q_r = -(lap w)' with lap w = x (8 B + 24 r^2) / 192; m_rt = (1 - nu) (w / r)',t.
    q_r = -(8.0 * B + 72.0) / 192.0
    twist = -(1.0 - NU) * (2.0 * B + 4.0) / 192.0  # m_rt is this times sin
    return w, q_r - twist


@pytest.mark.parametrize("support", HELD)
def test_a_disc_under_a_liquid_is_exact(support):
    """Whose pressure grows along y."""
    weight, level = 9.81e3, 2.0
    found = disc(support, Hydrostatic(level=level, specific_weight=-weight))
    points = polar(np.array([0.05, 0.3, 0.6, 0.9, 1.0]))
    even = oracles_round.disc(
        np.hypot(*points.T), 1.0, support, pressure=-weight * level, rigidity=D
    )
    turned, v_n = tilted(support, points[:, ::-1])
    exact = even.w + weight * turned / D
    assert_allclose(found.deflection(points), exact, atol=1e-10 * np.abs(exact).max())
    (rim,) = found.reactions().sides
    reaction = weight * level / 2.0 + weight * v_n * rim.stations[:, 1]
    assert_allclose(rim.line_reaction, reaction, rtol=1e-4)
    assert found.reactions().imbalance < 1e-12


def test_a_disc_turned_at_its_rim_is_exact():
    """An edge moment bends it to a paraboloid."""
    found = disc(SIMPLY_SUPPORTED, EdgeMoment(moment=M, along="rim"))
    r = np.array([0.0, 0.4, 0.7, 0.95, 1.0])
    exact = M * (r**2 - 1.0) / (2.0 * D * (1.0 + NU))
    assert_allclose(found.deflection(polar(r)), exact, atol=1e-11 * np.abs(exact).max())
    assert_allclose(found.moments(polar(r)), [[M, M, 0.0]] * 5, atol=1e-8 * M)
    assert found.load_work() == pytest.approx(2.0 * math.pi * M**2 / (D * (1.0 + NU)))


def test_forces_and_moments_along_arcs_are_as_stated():
    """Their sum is that of the true length, their work that of the true slope."""
    found = disc(CLAMPED, LineForce(force=F, along="rim"), radius=0.7)
    assert found.load_force() == pytest.approx(F * 2.0 * math.pi * 0.7, rel=1e-12)
    (rim,) = found.reactions().sides
    assert rim.resultant.force == pytest.approx(-found.load_force(), rel=1e-11)
    assert_allclose(found.deflection(polar(0.5)), 0.0, atol=1e-15)


def test_chords_that_stand_for_an_arc_deflect_as_the_disc():
    """A simply supported polygon of 48 sides would deflect as if it were clamped."""
    angle = 2.0 * np.pi * np.arange(48) / 48
    points = np.column_stack([np.cos(angle), np.sin(angle)])
    outline = Outline.polygon(points, sides=("rim",) * 48, chords="arc")
    found = solution(plate(outline, {"rim": supports.SIMPLY_SUPPORTED}), Pressure(P))
    exact = oracles_round.disc(0.0, 1.0, SIMPLY_SUPPORTED, pressure=P, rigidity=D).w
    assert_allclose(found.deflection([(0.0, 0.0)]), exact, rtol=1e-8)


# Rings.


@pytest.mark.parametrize(("inner", "outer"), PAIRS)
def test_rings_deflect_and_bend_as_in_closed_form(inner, outer):
    found = ring(inner, outer)
    r = np.array([0.4, 0.55, 0.7, 0.85, 1.0])
    exact, points = exact_ring(r, inner, outer), polar(r)
    assert_allclose(
        found.deflection(points), exact.w, atol=1e-4 * np.abs(exact.w).max()
    )
    m_rr, m_tt, _ = radial(found.moments(points), points)
    size = max(np.abs(exact.m_rr).max(), np.abs(exact.m_tt).max())
    assert_allclose(m_rr, exact.m_rr, atol=4e-3 * size)
    assert_allclose(m_tt, exact.m_tt, atol=4e-3 * size)


@pytest.mark.parametrize(("inner", "outer"), PAIRS)
def test_rings_bring_the_reactions_of_the_closed_form(inner, outer):
    found = ring(inner, outer).reactions()
    exact = exact_ring(np.array(RADII), inner, outer)
    for side in found.sides:
        k = ("hole", "rim").index(side.side)
        v_n = exact.q_r[k] * (2.0 * k - 1.0)
        size = np.abs(exact.q_r).max()
        assert_allclose(side.line_reaction, v_n, atol=0.15 * size)
        assert np.mean(side.line_reaction) == pytest.approx(v_n, abs=1e-2 * size)
        held = exact.m_rr[k] if side.support.holds_slope else 0.0
        assert_allclose(side.line_moment, held, atol=0.02 * np.abs(exact.m_rr).max())
        whole = 2.0 * math.pi * RADII[k] * v_n
        assert side.resultant.force == pytest.approx(whole, abs=1e-5 * size)
    assert found.imbalance < 1e-12


def test_a_finer_mesh_has_the_ring_more_closely():
    """W by the sixth power of the size, nearly."""
    stated = ring(FREE, SIMPLY_SUPPORTED).plate
    exact = oracles_round.annulus(
        [0.4], RADII, (FREE, SIMPLY_SUPPORTED), pressure=P, rigidity=D
    ).w
    points = polar(0.4)
    off = [
        np.abs(
            solution(stated, Pressure(P), size=size, around=around).deflection(points)
            - exact
        ).max()
        for size, around in ((0.4, 12), (0.2, 24))
    ]
    assert off[1] < off[0] / 20.0


# Round sides among straight ones.


def half_disc(line, arc):
    outline = Outline.polygon(
        [(-1.0, 0.0), (1.0, 0.0)], sides=("line", "arc"), bulges=[0.0, 1.0]
    )
    return plate(outline, {"line": line, "arc": arc})


def rounded(support):
    shape = Rectangle(
        centre=(0.0, 0.0), size=(2.0, 1.2), name="rim", corner_radius=0.25
    )
    return plate(Outline.of(shape), {"rim": support})


def slotted(support):
    outline = Outline.polygon(
        [(0, 0), (2, 0), (2, 1), (0, 1)], sides=("south", "east", "north", "west")
    ).cut(Slot(centre=(1.0, 0.5), length=0.8, width=0.3, name="slot", angle=0.3))
    held = dict.fromkeys(("south", "north"), supports.SIMPLY_SUPPORTED)
    return plate(outline, {**held, "slot": support})


def filleted(support):
    outline = Outline.polygon(
        [(0, 0), (2, 0), (2, 1), (0, 1)], sides=("south", "east", "north", "west")
    ).fillet("south", "east", radius=0.3, name="fillet")
    return plate(outline, dict.fromkeys(("south", "fillet", "north"), support))


SS, CL, FR, GU = (
    supports.SIMPLY_SUPPORTED,
    supports.CLAMPED,
    supports.FREE,
    supports.GUIDED,
)
MIXED = {
    "half disc, simply supported": half_disc(SS, SS),
    "half disc, clamped arc": half_disc(SS, CL),
    "half disc, clamped line": half_disc(CL, FR),
    "half disc, free line": half_disc(FR, SS),
    "rounded, simply supported": rounded(SS),
    "rounded, clamped": rounded(CL),
    "slot, free": slotted(FR),
    "slot, simply supported": slotted(SS),
    "slot, clamped": slotted(CL),
    "fillet, simply supported": filleted(SS),
    "fillet, clamped": filleted(CL),
}


@pytest.mark.parametrize("stated", MIXED.values(), ids=MIXED)
def test_sides_corners_and_loads_are_in_balance(stated):
    """All sides and corners bring what the loads, on the true area, ask for."""
    found = solution(stated, Pressure(P), size=0.25, around=16).reactions()
    whole = -P * stated.outline.area
    assert found.load.force == pytest.approx(-whole, rel=1e-11)
    assert found.total.force == pytest.approx(whole, rel=1e-10)
    assert found.imbalance < 1e-11
    brought = sum(side.resultant.force for side in found.sides)
    brought += sum(c.force.value for c in found.corners if math.isfinite(c.force.value))
    assert brought == pytest.approx(whole, rel=1e-10)


def shares(stated, **options):
    """Force of each side and point support, as a share of the load."""
    found = solution(stated, Pressure(P), **options).reactions()
    brought = {side.side: side.resultant.force for side in found.sides}
    brought |= {point.mark: point.force.value for point in found.points}
    return {name: force / found.total.force for name, force in brought.items()}


def test_lines_opposite_a_round_edge_do_not_take_what_it_brings():
    """Where triangles reach from one held line to another."""
    hole = Circle(centre=(0.0, 0.85), radius=0.145, name="hole")
    outline = Outline.circle((0.0, 0.0), radius=1.0).cut(hole)
    stated = plate(outline, {"rim": SS, "hole": CL})
    coarse, fine = shares(stated), shares(stated, size=0.1, around=32)
    assert sum(coarse.values()) == pytest.approx(1.0, rel=1e-10)
    for name, share in coarse.items():
        assert share == pytest.approx(fine[name], abs=5e-4)


def test_a_point_opposite_a_round_edge_does_not_take_what_it_brings():
    outline = Outline.circle((0.0, 0.0), radius=1.0).mark((0.75, 0.0), name="post")
    stated = plate(outline, {"rim": SS, "post": SS})
    coarse, fine = shares(stated), shares(stated, size=0.08, around=48)
    assert sum(coarse.values()) == pytest.approx(1.0, rel=1e-10)
    for name, share in coarse.items():
        assert share == pytest.approx(fine[name], abs=2e-3)


def test_half_a_disc_is_half_of_the_disc():
    """Guided along its diameter; and simply supported it is the odd half."""
    points = np.array([(0.0, 0.0), (0.3, 0.4), (-0.5, 0.5)])
    for support, held in ((CLAMPED, CL), (SIMPLY_SUPPORTED, SS)):
        even = solution(half_disc(GU, held), Pressure(P), size=0.3, around=16)
        exact = oracles_round.disc(
            np.hypot(*points.T), 1.0, support, pressure=P, rigidity=D
        )
        assert_allclose(
            even.deflection(points), exact.w, atol=1e-9 * np.abs(exact.w).max()
        )
        odd = solution(
            half_disc(SS, held),
            Hydrostatic(level=0.0, specific_weight=1e3, up=(0.0, -1.0)),
            size=0.3,
            around=16,
        )
        exact = 1e3 * tilted(support, points[:, ::-1])[0] / D
        assert_allclose(odd.deflection(points), exact, atol=1e-9 * np.abs(exact).max())


# The true region.


def test_fitted_meshes_cover_the_true_area():
    for stated in MIXED.values():
        mesh = fitted(mesh_outline(stated.outline, size=0.4, around=12))
        arcs = round_edges(stated, mesh)
        assert len(np.unique(arcs.rows)) == len(arcs)
        assert (arcs.steepness >= 0.3).all()
        assert (np.abs(arcs.turn) <= 1.1).all()
        straight = np.delete(mesh.areas, arcs.rows).sum()
        area = straight + arcs.rule[1].sum()
        assert area == pytest.approx(stated.outline.area, rel=1e-12)


def test_a_triangle_with_two_round_edges_is_parted():
    """In the corner where two arcs meet; its own arcs could not be followed."""
    outline = Outline.polygon(
        [(-1.0, 0.0), (1.0, 0.0)], sides=("low", "high"), bulges=[0.3, 0.3]
    )
    stated = plate(outline, {"low": SS, "high": SS})
    mesh = mesh_outline(outline, size=0.5, around=12)
    with pytest.raises(MeshError, match="two round edges"):
        round_edges(stated, mesh)
    arcs = round_edges(stated, fitted(mesh))
    assert len(np.unique(arcs.rows)) == len(arcs)


def test_places_in_a_round_hole_are_not_on_the_plate():
    found = ring(FREE, CLAMPED)
    beside, within = polar(0.4 + 1e-4), polar(0.4 - 1e-4)
    assert found.mesh.covers(beside).all()
    assert not found.mesh.covers(within).any()
    edge, out = polar(1.0 - 1e-6), polar(1.0 + 1e-6)
    assert found.mesh.covers(edge).all()
    assert not found.mesh.covers(out).any()


@pytest.mark.parametrize("quantity", ["von Mises", "deflection", "shear stress"])
def test_peaks_lie_on_the_plate(quantity):
    """On the rim itself, not where a triangle reaches into the hole."""
    for pair in ((FREE, SIMPLY_SUPPORTED), (FREE, CLAMPED), (CLAMPED, FREE)):
        x, y = ring(*pair).peak(quantity).place
        assert RADII[0] - 1e-9 <= math.hypot(x, y) <= RADII[1] + 1e-9


@pytest.mark.parametrize("quantity", ["von Mises", "deflection"])
def test_sums_of_unit_cases_peak_where_one_case_of_them_does(quantity):
    """At a free round rim."""
    stated = ring(FREE, SIMPLY_SUPPORTED).plate
    mesh = fitted(mesh_outline(stated.outline, size=0.35, around=16))
    cases = [
        Case(name="whole", loads=[Pressure(P), LineForce(force=F, along="hole")]),
        Case(name="pressure", loads=[Pressure(P)]),
        Case(name="force", loads=[LineForce(force=F, along="hole")]),
    ]
    found = Solution(state=solve_static(stated, mesh, cases, element="quintic"))
    weights = np.array([0.0, 1.0, 1.0])
    own = Basis(solution=found).peak(quantity, weights, (), "sum")
    exact = found.peak(quantity, case="whole")
    assert own.value == pytest.approx(exact.value, rel=1e-6)
    assert RADII[0] - 1e-9 <= math.hypot(*own.place) <= RADII[1] + 1e-9


def test_samples_reach_the_rims():
    """Those of pictures and peaks; none lies beyond."""
    found = ring(FREE, CLAMPED)
    reach = np.hypot(*found.field_points.T)
    assert reach.min() >= RADII[0] - 1e-12
    assert reach.max() <= RADII[1] + 1e-12
    rim = np.hypot(*found.field_points[found.field_edges.ravel()].T)
    off = np.minimum(np.abs(rim - RADII[0]), np.abs(rim - RADII[1]))
    assert off.max() < 1e-12


def test_a_force_off_the_plate_is_refused():
    """In the hole, but in a triangle that reaches into it."""
    stated = ring(FREE, CLAMPED).plate
    mesh = fitted(mesh_outline(stated.outline, size=0.35, around=16))
    arcs = round_edges(stated, mesh)
    hollow = arcs.turn < 0.0
    middle = arcs.chords[0][hollow][0]
    inside = 0.5 * (middle + arcs.at(np.array([0.5]))[0][hollow][0, 0])
    assert math.hypot(*inside) < RADII[0]
    case = Case(name="load", loads=[PointForce(force=1.0, at=tuple(inside))])
    with pytest.raises(InputError, match="not on the plate"):
        solve_static(stated, mesh, [case], element="quintic")
