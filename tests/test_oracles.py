"""The exact solutions stand on tables, on independent series and on identities.

Values with ten digits come from plate problems computed without finite elements,
the records of benchmarks/reference_static.json with their methods and published
figures. "TW" is Timoshenko and Woinowsky-Krieger, "Theory of Plates and Shells",
2nd ed. 1959, quoted from memory.
"""

from collections.abc import Callable
from functools import partial

import numpy as np
import oracles
import pytest
from numpy.polynomial import legendre

DOWN = oracles.LinearPressure(at_origin=-1.0)
TILTED = oracles.LinearPressure(at_origin=-1.0, gradient=(0.7, 0.4))
PATCH = oracles.PatchForce(centre=(0.4, 0.9), size=(0.3, 0.5), force=-2.0)
FORCE = oracles.PointForce(at=(0.3, 0.5), force=-2.0)
SIZE = (1.0, 1.3)

SIDES = ("clamped", "simply supported", "free")
ENDS = [(s, t) for s in SIDES for t in SIDES]


# Values from outside: a = 1, D = 1, nu = 0.3, load 1 downwards


def test_simply_supported_square_under_even_pressure():
    # Levy series checked by boundary collocation, ten digits, the corner eight.
    # Published: TW table 8: .00406, .0479, .420, .065.
    state = oracles.navier([(0.5, 0.5), (0.0, 0.5)], (1.0, 1.0), DOWN)
    assert -state.w[0] == pytest.approx(0.0040623526607, rel=1e-10)
    assert state.moments[0, 0] == pytest.approx(0.047886379633, rel=1e-10)
    assert -state.effective_shears[1, 0] == pytest.approx(0.42047085405, rel=1e-10)
    assert -state.shears[1, 0] == pytest.approx(0.33765724166, rel=1e-10)
    corners = oracles.navier_corner_forces((1.0, 1.0), DOWN)
    np.testing.assert_allclose(corners, -0.06496470236, rtol=1e-8)


def test_simply_supported_square_under_hydrostatic_pressure():
    # Boundary collocation, reactions to eight digits, the second corner to seven.
    # Published: TW tables for hydrostatic load: .00203, .0239, .126, .294, .026, .039.
    load = oracles.LinearPressure(gradient=(-1.0, 0.0))
    points = [(0.5, 0.5), (0.0, 0.5), (1.0, 0.5)]
    state = oracles.navier(points, (1.0, 1.0), load)
    assert -state.w[0] == pytest.approx(0.0020311763303, rel=1e-10)
    assert state.moments[0, 1] == pytest.approx(0.023943189816, rel=1e-10)
    reactions = state.effective_shears[1:, 0] * [-1.0, 1.0]
    assert reactions == pytest.approx([0.12642602274, 0.29404483132], rel=1e-7)
    corners = oracles.navier_corner_forces((1.0, 1.0), load)
    assert corners[:2] == pytest.approx([-0.025850981971, -0.039113720906], rel=1e-8)


def test_simply_supported_rectangle_under_a_patch():
    # Levy series. No published figure for this rectangle.
    load = oracles.PatchForce(centre=(0.5, 0.6), size=(0.2, 0.2), force=-1.0)
    state = oracles.navier([(0.5, 0.6), (0.5, 0.0)], (1.0, 1.2), load)
    assert -state.w[0] == pytest.approx(0.012799054297, rel=1e-10)
    moments = [0.22943499673, 0.21103712518]
    assert state.moments[0, :2] == pytest.approx(moments, rel=1e-9)
    assert -state.effective_shears[1, 1] == pytest.approx(0.50100102047, rel=1e-10)
    corners = oracles.navier_corner_forces((1.0, 1.2), load)
    np.testing.assert_allclose(corners, -0.11416211811, rtol=1e-9)


def test_simply_supported_square_under_a_point_force():
    # Boundary collocation, the corner by Levy series. Published for a central force:
    # Roark, table 11.4 case 1b: .1267 P a^2 / E t^3 = .011603; TW .0116.
    centre = oracles.PointForce(at=(0.5, 0.5), force=-1.0)
    state = oracles.navier([(0.5, 0.5), (0.25, 0.5)], (1.0, 1.0), centre)
    assert -state.w == pytest.approx([0.011600839772, 0.0071392273256], rel=1e-9)
    moments = [0.059451481078, 0.098680270428]
    assert state.moments[1, :2] == pytest.approx(moments, rel=1e-9)
    corners = oracles.navier_corner_forces((1.0, 1.0), centre)
    np.testing.assert_allclose(corners, -0.12190534385, rtol=1e-9)
    off_centre = oracles.PointForce(at=(0.25, 0.25), force=-1.0)
    state = oracles.navier([(0.5, 0.5)], (1.0, 1.0), off_centre)
    assert -state.w[0] == pytest.approx(0.0047676730616, rel=1e-9)
    assert state.moments[0, 2] == pytest.approx(-0.015238167981, rel=1e-9)


# Ends; then for the square -w and m_yy at the centre, m_yy at the middle of y = 0, -w
# at the middle of y = 1. Boundary collocation, edge moments to eight digits.
# Published: TW tables 29, 32, 41, 40 and 47 (its .01509 for .0150113 is a misprint).
LEVY = [
    ("CC", 0.001917137991, 0.033244886164, -0.069837434847, 0.0),
    ("CS", 0.002785493997, 0.039178149188, -0.083875197963, 0.0),
    ("CF", 0.0056671952127, 0.027982617559, -0.11840666853, 0.011235939499),
    ("SF", 0.0079309049734, 0.038980893216, 0.0, 0.012852414832),
    ("FF", 0.013093681302, 0.027078215142, 0.0, 0.015011256976),
]


@pytest.mark.parametrize(("ends", "w", "m_yy", "edge", "w_end"), LEVY)
def test_square_with_two_opposite_sides_simply_supported(ends, w, m_yy, edge, w_end):
    words = {"C": "clamped", "S": "simply supported", "F": "free"}
    pair = (words[ends[0]], words[ends[1]])
    points = [(0.5, 0.5), (0.5, 0.0), (0.5, 1.0)]
    state = oracles.levy(points, (1.0, 1.0), DOWN, ends=pair)
    assert -state.w[[0, 2]] == pytest.approx([w, w_end], rel=1e-9, abs=1e-15)
    assert state.moments[:2, 1] == pytest.approx([m_yy, edge], rel=1e-8, abs=1e-12)


# b; -w and m_xx at the centre; m_xx in the middle of x = 0, m_yy in the middle of
# y = 0, reaction in the middle of x = 0. Boundary collocation, the last three to
# eight digits. Published: TW table 35; square: .00126, .0231 (misprint), .0513.
CLAMPED = [
    (
        1.0,
        1.2653190875e-3,
        0.022905090784,
        -0.051333764782,
        -0.051333764766,
        0.44130115,
    ),
    (
        2.0,
        2.5329557686e-3,
        0.041154990163,
        -0.082866062614,
        -0.056986645607,
        0.51601532,
    ),
]


@pytest.mark.parametrize(("b", "w", "m_xx", "edge_x", "edge_y", "v"), CLAMPED)
def test_clamped_rectangle_under_even_pressure(b, w, m_xx, edge_x, edge_y, v):
    points = [(0.5, b / 2), (0.0, b / 2), (0.5, 0.0)]
    state = oracles.clamped_rectangle(points, (1.0, b), DOWN)
    assert -state.w[0] == pytest.approx(w, rel=1e-10)
    assert state.moments[0, 0] == pytest.approx(m_xx, rel=1e-9)
    edges = state.moments[1, 0], state.moments[2, 1]
    assert edges == pytest.approx((edge_x, edge_y), rel=1e-8)
    assert -state.effective_shears[1, 0] == pytest.approx(v, rel=5e-8)


def test_discs_and_rings():
    # Closed forms in 40-digit arithmetic. Published: TW arts. 16 and 19 for discs.
    disc = oracles.disc([0.0, 0.5], 1.0, "simply supported", pressure=-1.0)
    assert -disc.w == pytest.approx([5.3 / 1.3 / 64, 0.044846754808], rel=1e-10)
    assert disc.m_tt == pytest.approx([3.3 / 16, 0.1765625], rel=1e-10)
    disc = oracles.disc([0.0, 0.5, 1.0], 1.0, "clamped", force=-1.0)
    centre, half = 1 / (16 * np.pi), 0.0080259134101
    assert -disc.w == pytest.approx([centre, half, 0.0], rel=1e-10)
    assert disc.m_rr[1:] == pytest.approx([-0.0078709014963, -1 / 4 / np.pi], rel=1e-10)
    ring = oracles.annulus([0.3, 1.0], (0.3, 1.0), SIDES[:0:-1], pressure=-1.0)
    assert -ring.w == pytest.approx([0.076128476962, 0.0], rel=1e-10, abs=1e-15)
    assert ring.m_tt == pytest.approx([0.32722674829, 0.10190915735], rel=1e-10)
    ring = oracles.annulus([0.5, 1.0], (0.5, 1.0), ("free", "clamped"), pressure=-1.0)
    assert -ring.w[0] == pytest.approx(0.0052688697224, rel=1e-10)
    assert ring.m_rr[1] == pytest.approx(-0.079997215405, rel=1e-10)
    assert ring.q_r[1] == pytest.approx(0.375, rel=1e-10)


# Series of another kind: Navier's double sum, term by term


def double_series(
    point: tuple[float, float], load_factor: Callable[..., np.ndarray]
) -> float:
    """Deflection at a point, from the factors of sin(i pi x / a) sin(j pi y / b)."""
    i, j = np.arange(1, 801)[:, None], np.arange(1, 801)
    k, l = np.pi * i / SIZE[0], np.pi * j / SIZE[1]
    waves = np.sin(k * point[0]) * np.sin(l * point[1])
    return float(np.sum(load_factor(k, l) * waves / (k**2 + l**2) ** 2))


def patch_factor(k: np.ndarray, l: np.ndarray) -> np.ndarray:
    (x, y), (u, v) = PATCH.centre, PATCH.size
    mean = np.sin(k * u / 2) * np.sin(l * v / 2) / (k * u / 2 * l * v / 2)
    return 4 * PATCH.force / np.prod(SIZE) * mean * np.sin(k * x) * np.sin(l * y)


def linear_factor(k: np.ndarray, l: np.ndarray) -> np.ndarray:
    (a, b), (g_x, g_y) = SIZE, TILTED.gradient
    even_x, even_y = ((1 - np.cos(t * s)) / t for t, s in ((k, a), (l, b)))
    first_x, first_y = (-s * np.cos(t * s) / t for t, s in ((k, a), (l, b)))
    whole = TILTED.at_origin * even_x * even_y
    return 4 / (a * b) * (whole + g_x * first_x * even_y + g_y * even_x * first_y)


@pytest.mark.parametrize("point", [(0.4, 0.9), (0.55, 1.1), (0.25, 0.3), (0.9, 0.02)])
@pytest.mark.parametrize(
    ("load", "factor"), [(PATCH, patch_factor), (TILTED, linear_factor)]
)
def test_single_and_double_series_agree(point, load, factor):
    found = oracles.navier([point], SIZE, load).w[0]
    assert found == pytest.approx(double_series(point, factor), rel=1e-9)


# Identities

POINTS = np.array([(0.37, 0.81), (0.82, 0.24), (0.13, 1.02)])


def pressure_of(load: oracles.Load, xy: np.ndarray) -> np.ndarray:
    if isinstance(load, oracles.LinearPressure):
        return load.at_origin + xy @ load.gradient
    if isinstance(load, oracles.PointForce):
        return np.zeros(len(xy))
    inside = np.all(np.abs(xy - load.centre) < np.array(load.size) / 2, axis=1)
    return np.where(inside, load.force / np.prod(load.size), 0.0)


def fields() -> dict[str, tuple[Callable, Callable]]:
    """Each solution as a function of points, and its pressure."""
    found: dict[str, tuple[Callable, Callable]] = {}

    def add(name: str, solution: Callable, load: oracles.Load) -> None:
        found[name] = (
            (lambda p: solution(p, SIZE, load)),
            (lambda p: pressure_of(load, p)),
        )

    for load in (TILTED, PATCH, FORCE):
        kind = type(load).__name__
        add(f"navier {kind}", oracles.navier, load)
        for ends in ENDS:
            add(f"levy {ends} {kind}", partial(oracles.levy, ends=ends), load)
    add("clamped", oracles.clamped_rectangle, TILTED)
    for name, c in (
        ("bubble", oracles.clamped_bubble(SIZE)),
        ("random", np.random.default_rng(7).normal(size=(6, 6))),
    ):
        found[name] = (
            partial(oracles.polynomial, coefficients=c),
            partial(oracles.polynomial_pressure, coefficients=c),
        )
    found["triangle"] = (
        partial(oracles.polynomial, coefficients=oracles.triangle(2.5, -3.0)),
        lambda p: np.full(len(p), -3.0),
    )
    for side in SIDES[:2]:
        c = oracles.tilted_disc(1.5, side, 2.0)
        tilted = partial(oracles.polynomial, coefficients=c)
        found[f"tilted disc {side}"] = tilted, lambda p: 2.0 * p[:, 0]
    found["sine"] = (
        partial(oracles.sine, size=SIZE, waves=(2, 3), pressure=2.0),
        lambda p: 2 * np.prod(np.sin(np.pi * p * [2 / SIZE[0], 3 / SIZE[1]]), axis=1),
    )
    return found


FIELDS = fields()


@pytest.mark.parametrize("name", FIELDS)
def test_derivatives_are_derivatives_and_balance_the_load(name):
    """D lap lap w = p, the last derivatives and each other one by differences."""
    (solution, pressure), h = FIELDS[name], 1e-3
    steps = [k * h * axis for axis in np.eye(2) for k in (-2, -1, 1, 2)]
    shifted = np.concatenate([POINTS + step for step in [0.0 * POINTS[0], *steps]])
    w = solution(shifted).derivatives.reshape(4, 4, 9, -1)
    here = w[:, :, 0]
    d_x, d_y = (
        (8 * (w[:, :, k + 2] - w[:, :, k + 1]) - (w[:, :, k + 3] - w[:, :, k])) / 12 / h
        for k in (1, 5)
    )
    for i, j in ((0, 0), (1, 0), (0, 1), (2, 0), (1, 1), (0, 2)):
        np.testing.assert_allclose(d_x[i, j], here[i + 1, j], rtol=1e-6, atol=1e-6)
        np.testing.assert_allclose(d_y[i, j], here[i, j + 1], rtol=1e-6, atol=1e-6)
    load = d_x[3, 0] + 2 * d_x[1, 2] + d_y[0, 3]
    np.testing.assert_allclose(load, pressure(POINTS), rtol=1e-6, atol=1e-5)


def test_moments_and_shears_of_a_cubic():
    """D w = x^3 + 2 x^2 y + 3 x y^2 + 5 y^3 at (1, 2), by hand; nu = 1/4, D = 2."""
    c = np.zeros((4, 4))
    c[[3, 2, 1, 0], [0, 1, 2, 3]] = 1.0, 2.0, 3.0, 5.0
    state = oracles.polynomial([(1.0, 2.0)], c, nu=0.25, rigidity=2.0)
    assert state.w == pytest.approx([57.0 / 2])
    assert state.slopes[0] == pytest.approx([23.0 / 2, 74.0 / 2])
    assert state.moments[0] == pytest.approx([14 + 66 / 4, 66 + 14 / 4, 16 * 3 / 4])
    assert state.shears[0] == pytest.approx([-12.0, -34.0])
    assert state.effective_shears[0] == pytest.approx([-16.5, -37.0])


def boundary(n: int) -> tuple[np.ndarray, np.ndarray]:
    """Gauss points (4, n, 2) and weights (4, n) on south, east, north, west of SIZE.

    A cubic change of variable crowds them towards the corners.
    """
    t, weight = legendre.leggauss(n)
    t, weight = (3 * t - t**3) / 4 + 0.5, weight * 3 * (1 - t**2) / 4
    a, b = SIZE
    zero, one = np.zeros(n), np.ones(n)
    sides = [(a * t, zero), (a * one, b * t), (a * t, b * one), (zero, b * t)]
    return np.stack(sides).transpose(0, 2, 1), np.outer([a, b, a, b], weight)


@pytest.mark.parametrize("load", [TILTED, PATCH, FORCE], ids=lambda l: type(l).__name__)
def test_reactions_of_navier_balance_force_and_moments(load):
    points, weights = boundary(40)
    v = oracles.navier(points.reshape(-1, 2), SIZE, load).effective_shears
    v = v.reshape(4, -1, 2)
    forces = np.stack([-v[0, :, 1], v[1, :, 0], v[2, :, 1], -v[3, :, 0]]) * weights
    a, b = SIZE
    corners = np.array([(0.0, 0.0), (a, 0.0), (a, b), (0.0, b)])
    at = np.concatenate([points.reshape(-1, 2), corners])
    up = np.append(forces, oracles.navier_corner_forces(SIZE, load))
    arms = np.column_stack([np.ones(len(at)), at])
    if load is TILTED:
        (g_x, g_y), x, y = load.gradient, a / 2, b / 2
        mean = load.at_origin + g_x * x + g_y * y
        turn = [mean * x + g_x * a**2 / 12, mean * y + g_y * b**2 / 12]
        applied = np.array([mean, *turn]) * a * b
    else:
        centre = load.centre if load is PATCH else load.at
        applied = load.force * np.array([1.0, *centre])
    np.testing.assert_allclose(up @ arms, -applied, rtol=1e-6)


@pytest.mark.parametrize("ends", [("clamped", "free"), ("simply supported", "free")])
def test_reactions_of_levy_balance_the_force(ends):
    points, weights = boundary(12)
    a, b = SIZE
    corners = [(0.0, 0.0), (a, 0.0), (a, b), (0.0, b)]
    every = np.concatenate([points.reshape(-1, 2), corners])
    state = oracles.levy(every, SIZE, TILTED, ends=ends)
    v = state.effective_shears[:-4].reshape(4, -1, 2)
    forces = np.stack([-v[0, :, 1], v[1, :, 0], v[2, :, 1], -v[3, :, 0]]) * weights
    up = np.sum(forces) + state.moments[-4:, 2] @ [2.0, -2.0, 2.0, -2.0]
    mean = TILTED.at_origin + np.dot(TILTED.gradient, SIZE) / 2
    assert up == pytest.approx(-mean * a * b, rel=1e-4)


def test_clamped_reactions_balance_the_force():
    """The shears near a corner, where they go as r^0.74, limit this one."""
    points, weights = boundary(24)
    state = oracles.clamped_rectangle(points.reshape(-1, 2), SIZE, TILTED)
    v = state.effective_shears.reshape(4, -1, 2)
    forces = np.stack([-v[0, :, 1], v[1, :, 0], v[2, :, 1], -v[3, :, 0]]) * weights
    mean = TILTED.at_origin + np.dot(TILTED.gradient, SIZE) / 2
    assert np.sum(forces) == pytest.approx(-mean * np.prod(SIZE), rel=1e-4)


@pytest.mark.parametrize("load", [TILTED, PATCH, FORCE], ids=lambda l: type(l).__name__)
@pytest.mark.parametrize("ends", ENDS)
def test_levy_meets_its_end_conditions(ends, load):
    state = oracles.levy([(0.3, 0.0), (0.3, SIZE[1])], SIZE, load, ends=ends)
    inside = oracles.levy([(0.3, 0.6)], SIZE, load, ends=ends)
    for k, end in enumerate(ends):
        w, slope = state.w[k], state.slopes[k, 1]
        m, v = state.moments[k, 1], state.effective_shears[k, 1]
        pair = {"clamped": (w, slope), "simply supported": (w, m), "free": (m, v)}
        assert np.abs(pair[end]).max() < 1e-8 * np.abs(inside.moments).max()


def test_a_long_plate_is_a_strip_and_overflows_nowhere():
    """5/384 and 1/8, the beam's, in the middle of 1 x 40 and of 40 x 1."""
    long = oracles.levy([(0.5, 20.0)], (1.0, 40.0), DOWN, ends=("free", "clamped"))
    wide = oracles.navier([(20.0, 0.5)], (40.0, 1.0), DOWN)
    assert [*long.w, *wide.w] == pytest.approx([-5 / 384] * 2, rel=1e-12)
    assert [long.moments[0, 0], wide.moments[0, 1]] == pytest.approx([0.125] * 2)


def test_two_forces_are_reciprocal():
    here, there = (0.3, 0.5), (0.71, 1.12)
    pairs = [(here, there), (there, here)]
    for ends in ENDS:
        w = [
            oracles.levy([at], SIZE, oracles.PointForce(at=force), ends=ends).w[0]
            for force, at in pairs
        ]
        assert w[0] == pytest.approx(w[1], rel=1e-10)
    w = [
        oracles.clamped_disc_force([at], 1.4, oracles.PointForce(at=force))[0]
        for force, at in pairs
    ]
    assert w[0] == pytest.approx(w[1], rel=1e-12)


def test_patches_that_tile_the_plate_make_an_even_pressure():
    a, b = SIZE
    w = m = 0.0
    for x, y in ((0.2, 0.35), (0.7, 0.35), (0.2, 1.0), (0.7, 1.0)):
        size = (0.4 if x < 0.4 else 0.6, 0.7 if y < 0.7 else 0.6)
        force = -size[0] * size[1]
        patch = oracles.PatchForce(centre=(x, y), size=size, force=force)
        state = oracles.navier(POINTS, (a, b), patch)
        w, m = w + state.w, m + state.moments
    whole = oracles.navier(POINTS, (a, b), DOWN)
    np.testing.assert_allclose(w, whole.w, rtol=1e-10)
    np.testing.assert_allclose(m, whole.moments, rtol=1e-9)


def test_no_moment_is_given_under_a_point_force():
    state = oracles.navier([FORCE.at, (0.3, 0.501)], SIZE, FORCE)
    assert np.isnan(state.moments[0]).all()
    assert np.isnan(state.shears[0]).all()
    assert np.isfinite(state.w).all()
    assert np.isfinite(state.moments[1]).all()
    disc = oracles.disc([0.0, 0.1], 1.0, "clamped", force=1.0)
    assert np.isnan([disc.m_rr[0], disc.m_tt[0], disc.q_r[0]]).all()
    assert np.isfinite(disc.w).all()


def test_a_stiffer_plate_deflects_less_and_carries_the_same():
    one = oracles.clamped_rectangle(POINTS, SIZE, TILTED)
    five = oracles.clamped_rectangle(POINTS, SIZE, TILTED, rigidity=5.0)
    np.testing.assert_allclose(five.w, one.w / 5, rtol=1e-12)
    np.testing.assert_allclose(five.moments, one.moments, rtol=1e-12)
    soft = oracles.annulus([0.5], (0.4, 1.0), ("clamped", "free"), rigidity=0.5)
    ring = oracles.annulus([0.5], (0.4, 1.0), ("clamped", "free"))
    assert soft.w[0] == pytest.approx(2 * ring.w[0])
    assert soft.m_rr[0] == pytest.approx(ring.m_rr[0])


@pytest.mark.parametrize("inner", SIDES)
@pytest.mark.parametrize("outer", SIDES[:2])
def test_rings_meet_their_rims_and_the_load(inner, outer):
    radii = (0.4, 1.5)
    rims = oracles.annulus(radii, radii, (inner, outer), pressure=-2.0)
    for k, word in enumerate((inner, outer)):
        w, slope, m, q = rims.w[k], rims.slope[k], rims.m_rr[k], rims.q_r[k]
        pair = {"clamped": (w, slope), "simply supported": (w, m), "free": (m, q)}
        assert np.abs(pair[word]).max() < 1e-13
    total = 2 * np.pi * (radii[1] * rims.q_r[1] - radii[0] * rims.q_r[0])
    assert total == pytest.approx(2 * np.pi * (radii[1] ** 2 - radii[0] ** 2))
    r, h = np.array([0.5, 0.9, 1.3]), 1e-5
    here, near, far = (
        oracles.annulus(r + d, radii, (inner, outer), pressure=-2.0)
        for d in (0.0, -h, h)
    )
    spread = (far.m_rr - near.m_rr) / (2 * h) + (here.m_rr - here.m_tt) / r
    np.testing.assert_allclose(here.q_r, -spread, rtol=1e-7, atol=1e-8)
    np.testing.assert_allclose(here.slope, (far.w - near.w) / (2 * h), rtol=1e-7)


def test_the_bubble_is_clamped_on_its_four_sides():
    points, _ = boundary(5)
    state = oracles.polynomial(points.reshape(-1, 2), oracles.clamped_bubble(SIZE))
    assert np.abs(state.w).max() < 1e-14
    assert np.abs(state.slopes).max() < 1e-13
    assert np.abs(state.moments).max() > 0.1


def test_the_round_solutions_agree_where_they_meet():
    """Closed form at the centre, polynomial and force anywhere, on the same discs."""
    r = np.array([0.0, 0.4, 1.1])
    points = np.column_stack([r, 0 * r])
    force = oracles.PointForce(at=(0.0, 0.0), force=3.0)
    disc = oracles.disc(r, 1.4, "clamped", force=3.0)
    found = oracles.clamped_disc_force(points, 1.4, force)
    np.testing.assert_allclose(found, disc.w, rtol=1e-12)
    turn = np.linspace(0.0, 2 * np.pi, 7)
    normal = np.column_stack([np.cos(turn), np.sin(turn)])
    for side in SIDES[:2]:
        c = oracles.tilted_disc(1.4, side)
        rim = oracles.polynomial(1.4 * normal, c)
        m_xx, m_yy, m_xy = rim.moments.T
        x, y = normal.T
        m = m_xx * x**2 + 2 * m_xy * x * y + m_yy * y**2
        slope = np.sum(rim.slopes * normal, axis=1)
        assert np.abs(rim.w).max() < 1e-14
        assert np.abs(slope if side == "clamped" else m).max() < 1e-14


def test_the_triangle_is_simply_supported_on_its_three_sides():
    vertices = np.array([(2 / 3, 0.0), (-1 / 3, 3**-0.5), (-1 / 3, -(3**-0.5))])
    for k in range(3):
        start, end = vertices[k], vertices[(k + 1) % 3]
        along = (end - start) / np.linalg.norm(end - start)
        points = start + np.outer([0.2, 0.5, 0.9], end - start)
        state = oracles.polynomial(points, oracles.triangle(1.0))
        m_xx, m_yy, m_xy = state.moments.T
        n_x, n_y = along[1], -along[0]
        m = m_xx * n_x**2 + 2 * m_xy * n_x * n_y + m_yy * n_y**2
        assert np.abs(state.w).max() < 1e-15
        assert np.abs(m).max() < 1e-15
