"""The exponents against the determinant of the boundary rows, written here anew.

A field ``w = r**p F(theta)``, p = lambda + 1, with F in the four functions
``exp(+-i p theta)`` and ``exp(+-i (p - 2) theta)`` is biharmonic. On a ray theta =
const at r = 1 the plate has (polar coordinates; Timoshenko and Woinowsky-Krieger,
"Theory of Plates and Shells", from memory)

    slope    w,theta / r                                 F'
    moment   w,r / r + w,theta theta / r^2 + nu w,rr     F'' + (p + nu p (p - 1)) F
    shear    (lap w),theta / r + (1 - nu) d/dr [(w,theta / r),r]
                                       F''' + (p^2 + (1 - nu)(p - 1)(p - 2)) F'
"""

import itertools
import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from kplate import corners
from kplate.corners import UNBOUNDED, exponent, is_unbounded
from kplate.errors import InputError

C, S, F, G = "clamped", "simply supported", "free", "guided"
PAIRS = list(itertools.combinations_with_replacement((C, S, F, G), 2))
MIXED = [pair for pair in PAIRS if pair[0] != pair[1]]
POISSON = (0.0, 0.1, 0.23, 0.3, 0.5)
# Poisson's ratio enters through free edges only (tested below).
STATES = [(p, nu) for p in PAIRS for nu in (POISSON if F in p else (0.3,))]

# Every 10 degrees, the ends, and where roots meet, turn complex or change places:
# 2 alpha or alpha = 4.4934 (128.73, 257.45), sin(2 alpha)/(2 alpha) = 0.128 (79.9),
# C-F for small nu (94 to 101), S-S (269 to 271), straight and right angles.
SPECIAL = [1, 2, 5, 79.5, 80.5, 89.99, 90.01, 94.5, 95.5, 101, 128.5, 129, 179.9]
SPECIAL += [180.1, 225, 257, 258, 269, 271, 315, 359.5]
DEGREES = sorted([*range(10, 361, 10), *SPECIAL])

pairs = st.sampled_from(PAIRS)
angles = st.floats(math.radians(1.0), 2.0 * math.pi)
ratios = st.floats(0.0, 0.5)


def determinant(lam, angle, pair, nu):
    """Zero where a field exists: the factors of dependent functions are divided out."""
    lam = np.asarray(lam, dtype=complex)[..., None]
    p = lam + 1.0
    rate = 1j * np.concatenate([p, -p, p - 2.0, 2.0 - p], axis=-1)
    rows = []
    for theta, word in zip((0.0, angle), pair, strict=True):
        value = np.exp(rate * theta)
        slope = rate * value
        moment = (rate**2 + p + nu * p * (p - 1.0)) * value
        shear = (rate**3 + (p**2 + (1.0 - nu) * (p - 1.0) * (p - 2.0)) * rate) * value
        rows += {C: (value, slope), S: (value, moment), F: (moment, shear)}.get(
            word, (slope, shear)
        )
    lam = lam[..., 0]
    return np.linalg.det(np.stack(rows, axis=-2)) / (lam**2 * (lam**2 - 1.0))


def turns(path, angle, pair, nu):
    """How often the determinant goes round 0 along a closed path."""
    d = determinant(path, angle, pair, nu)
    steps = np.angle(d[1:] / d[:-1])
    assert np.abs(steps).max() < 1.5, "path too coarse to count on"
    return round(steps.sum() / (2.0 * math.pi))


def rectangle(left, right, top, n=500):
    """Counter-clockwise round [left, right] x [-top, top], finer at the real axis."""
    graded = np.geomspace(1e-3 * left, top, n)
    half = np.union1d(graded, np.linspace(0.0, top, n))
    up = 1j * np.concatenate([-half[:0:-1], half])
    across = np.linspace(left, right, n)
    return np.concatenate(
        [across - 1j * top, right + up, across[::-1] + 1j * top, left - up]
    )


@pytest.mark.parametrize(("pair", "nu"), STATES)
def test_a_field_belongs_to_every_exponent(pair, nu):
    circle = np.exp(2j * math.pi * np.linspace(0.0, 1.0, 25))
    for degrees in DEGREES:
        angle = math.radians(degrees)
        root = exponent(angle, pair, nu)
        near = root + 1e-6 * abs(root) * circle
        assert root.real > 0.0
        assert root.imag >= 0.0
        assert turns(near, angle, pair, nu) >= 1, f"{degrees} degrees: {root}"


@pytest.mark.parametrize(("pair", "nu"), STATES)
def test_no_root_with_a_smaller_real_part_is_missed(pair, nu):
    """Argument principle on the strip from 0 to 1 % before the exponent.

    The determinant of F-F and F-G has one root more, 1, which the next test dismisses.
    """
    for degrees in DEGREES:
        angle = math.radians(degrees)
        root = exponent(angle, pair, nu)
        left = 0.01 * min(1.0, root.real)
        path = rectangle(left, 0.99 * root.real, 1.5 * root.imag + 4.0 / angle)
        needs_force = pair in ((F, F), (F, G)) and root.real > 1.01
        assert turns(path, angle, pair, nu) == needs_force, f"{degrees} degrees: {root}"


@pytest.mark.parametrize("degrees", [1, 30, 90, 135, 179, 181, 270, 359])
def test_lambda_1_between_free_edges_needs_a_force_at_the_corner(degrees):
    """Constant moments without m_nn on either edge leave m_ns, which jumps there."""
    half = math.radians(degrees) / 2.0
    rows = []
    for sign in (-1.0, 1.0):  # edges at -+half, outward normals, tangents plate on left
        n = np.array([-math.sin(half), sign * math.cos(half)])
        s = np.array([-n[1], n[0]])
        rows.append([n[0] ** 2, n[1] ** 2, 2 * n[0] * n[1]])
        rows.append([n[0] * s[0], n[1] * s[1], n[0] * s[1] + n[1] * s[0]])
    normal_0, twist_0, normal_1, twist_1 = np.array(rows)
    moments = np.linalg.svd([normal_0, normal_1])[2][-1]
    assert abs((twist_1 - twist_0) @ moments) > 0.5 * abs(math.sin(2.0 * half))
    angle = 2.0 * half
    at_1, beside = np.abs(determinant([1.0 + 1e-7, 1.01], angle, (F, F), 0.3))
    assert at_1 < 1e-4 * beside
    assert abs(exponent(angle, (F, F), 0.3) - 1.0) > 1e-3


def k(nu):
    return (1.0 - nu) / (3.0 + nu)


EQUATIONS = {
    (C, C): lambda z, a, nu: np.sin(z * a) ** 2 - z**2 * np.sin(a) ** 2,
    (F, F): lambda z, a, nu: np.sin(z * a) ** 2 - (k(nu) * z * np.sin(a)) ** 2,
    (C, S): lambda z, a, nu: np.sin(2 * z * a) - z * np.sin(2 * a),
    (C, G): lambda z, a, nu: np.sin(2 * z * a) + z * np.sin(2 * a),
    (S, F): lambda z, a, nu: np.sin(2 * z * a) + k(nu) * z * np.sin(2 * a),
    (F, G): lambda z, a, nu: np.sin(2 * z * a) - k(nu) * z * np.sin(2 * a),
    (C, F): lambda z, a, nu: (
        np.sin(z * a) ** 2
        - 4.0 / ((3.0 + nu) * (1.0 - nu))
        + k(nu) * (z * np.sin(a)) ** 2
    ),
    (S, S): lambda z, a, nu: np.cos(2 * z * a) - np.cos(2 * a),
    (G, G): lambda z, a, nu: np.cos(2 * z * a) - np.cos(2 * a),
    (S, G): lambda z, a, nu: np.cos(2 * z * a) + np.cos(2 * a),
}


@pytest.mark.parametrize("pair", PAIRS)
@pytest.mark.parametrize("nu", POISSON)
def test_the_equations_of_the_module_are_the_determinant(pair, nu):
    """Up to a factor without the angle: one lambda, many angles, one ratio."""
    equation = EQUATIONS[pair]
    for lam in (0.37, 0.61 + 0.45j, 1.83 - 0.72j):
        angle = np.linspace(0.3, 6.2, 12)
        ratio = [determinant(lam, a, pair, nu) / equation(lam, a, nu) for a in angle]
        np.testing.assert_allclose(ratio, ratio[0], rtol=1e-8)


# Interior angles above which moments are unbounded, and exponents at 270 degrees:
# published by Williams 1952 and by Melzer and Rannacher (both from memory).
CRITICAL = [
    ((C, C), 0.3, 180.0),
    ((S, S), 0.3, 90.0),
    ((F, F), 0.3, 180.0),
    ((S, F), 0.3, 90.0),
    ((C, S), 0.3, 128.7),
    ((C, F), 0.3, 95.4),
    ((C, F), 0.0, 100.4),
    ((C, F), 0.5, 93.0),
]


@pytest.mark.parametrize(("pair", "nu", "critical"), CRITICAL)
def test_moments_are_unbounded_above_the_published_angle(pair, nu, critical):
    printed = 0.1  # the last digit, degrees
    assert exponent(math.radians(critical - printed), pair, nu).real > 1.0
    assert exponent(math.radians(critical + printed), pair, nu).real < 1.0


@pytest.mark.parametrize(("pair", "nu", "critical"), CRITICAL)
def test_moments_are_bounded_below_the_published_angle(pair, nu, critical):
    for degrees in range(1, int(critical)):
        assert not is_unbounded(math.radians(degrees), pair, nu)


REENTRANT = [
    ((C, C), 0.5445),
    ((S, S), 0.3333),
    ((F, F), 0.6379),
    ((C, S), 0.3333),
    ((S, F), 0.3333),
]


@pytest.mark.parametrize(("pair", "printed"), REENTRANT)
def test_exponent_of_a_reentrant_right_angle(pair, printed):
    root = exponent(1.5 * math.pi, pair, 0.3)
    assert root.real == pytest.approx(printed, abs=0.5e-4)
    assert root.imag == 0.0


def test_a_reentrant_right_angle_clamped_to_free_oscillates():
    root = exponent(1.5 * math.pi, (C, F), 0.3)
    assert root.real == pytest.approx(0.336, abs=0.5e-3)
    assert root.imag == pytest.approx(0.163, abs=0.5e-3)


@pytest.mark.parametrize("pair", MIXED)
@pytest.mark.parametrize("nu", POISSON)
def test_change_of_support_on_a_straight_side_is_a_square_root(pair, nu):
    """Moments as r**(-1/2), whatever the two supports."""
    assert exponent(math.pi, pair, nu).real == pytest.approx(0.5, abs=1e-12)


@pytest.mark.parametrize("word", [C, S, F, G])
def test_a_straight_side_is_bounded_and_a_slit_is_a_square_root(word):
    """Cylindrical bending on a side; lambda = 1/2 at a crack of any kind."""
    assert exponent(math.pi, (word, word), 0.3) == pytest.approx(1.0, abs=1e-12)
    assert exponent(2.0 * math.pi, (word, word), 0.3) == pytest.approx(0.5, abs=1e-12)


@pytest.mark.parametrize(("degrees", "lam"), [(60, 2.0), (120, 0.5), (150, 0.2)])
def test_simply_supported_corners_follow_the_membrane(degrees, lam):
    """With lap w a harmonic field that vanishes on the edges: abs(pi/alpha - 1)."""
    assert exponent(math.radians(degrees), (S, S), 0.3) == pytest.approx(lam, abs=1e-12)


def test_a_simply_supported_vertex_a_hair_off_straight_is_almost_a_kink():
    for hair in (1e-3, 1e-6):
        for turn in (-hair, hair):
            root = exponent(math.pi + turn, (S, S), 0.3)
            assert root == pytest.approx(hair / math.pi, rel=2e-3)


@pytest.mark.parametrize("pair", [(S, S), (G, G), (C, C), (F, F)])
def test_round_off_in_a_straight_angle_does_not_matter(pair):
    """A rigid tilt about the edge, lambda = 0, is not a corner field."""
    for turn in (-1e-12, 1e-12):
        assert exponent(math.pi + turn, pair, 0.3) == pytest.approx(1.0, abs=1e-9)


@pytest.mark.parametrize("word", [C, S, F])
@given(angle=st.floats(math.radians(0.5), math.pi - 0.01), nu=ratios)
def test_a_guided_edge_is_a_line_of_symmetry(word, angle, nu):
    """A symmetric corner is two halves: guided (even) or simply supported (odd)."""
    whole = exponent(2.0 * angle, (word, word), nu)
    halves = [exponent(angle, (word, middle), nu) for middle in (G, S)]
    nearest = min(halves, key=lambda root: root.real)
    assert nearest == pytest.approx(whole, rel=1e-9)


@given(angle=angles, pair=pairs, nu=ratios)
def test_the_order_of_the_edges_does_not_matter(angle, pair, nu):
    assert exponent(angle, pair, nu) == exponent(angle, pair[::-1], nu)


@given(angle=angles, pair=pairs.filter(lambda pair: F not in pair), nu=ratios)
def test_only_free_edges_know_poissons_ratio(angle, pair, nu):
    assert exponent(angle, pair, nu) == exponent(angle, pair, 0.3)


@pytest.mark.parametrize(
    ("pair", "last"), [((C, C), 360), ((F, F), 360), ((S, S), 180)]
)
def test_a_wider_corner_is_worse(pair, last):
    """S-S only to the straight side, where the exponent jumps from 0 to 1."""
    degrees = np.arange(1.0, last, 0.5)
    real = [exponent(math.radians(d), pair, 0.3).real for d in degrees]
    assert np.all(np.diff(real) < 0.0)


@pytest.mark.parametrize("pair", PAIRS)
def test_a_nearly_sharp_tip_scales_with_the_angle(pair):
    """For alpha to 0 the tip is a beam of varying width: lambda alpha tends to a limit.

    Guided on both sides it is a free strip and keeps lambda = 1.
    """
    tip = [math.radians(0.1), math.radians(0.2)]
    if pair == (G, G):
        assert [exponent(angle, pair, 0.3) for angle in tip] == [1.0, 1.0]
    else:
        z = [angle * exponent(angle, pair, 0.3) for angle in tip]
        assert z[0] == pytest.approx(z[1], rel=4e-3)


@pytest.mark.parametrize("pair", [p for p in PAIRS if G not in p])
@pytest.mark.parametrize("degrees", [89.99, 90.0, 90.01])
@pytest.mark.parametrize("nu", POISSON)
def test_rectangles_keep_their_corners(pair, degrees, nu):
    assert not is_unbounded(math.radians(degrees), pair, nu)


def test_unbounded_is_a_margin_below_one():
    """S-S crosses 1 - Re lambda = 0.02 at 180/1.98 = 90.909 degrees."""
    assert UNBOUNDED == 0.02
    assert exponent(math.radians(90.01), (S, S), 0.3).real < 1.0
    assert not is_unbounded(math.radians(90.90), (S, S), 0.3)
    assert is_unbounded(math.radians(90.92), (S, S), 0.3)


def test_an_oscillating_corner_is_unbounded_by_its_real_part():
    root = exponent(math.radians(100.0), (C, F), 0.3)
    assert root.real < 0.95
    assert abs(root) > 1.0
    assert is_unbounded(math.radians(100.0), (C, F), 0.3)


def test_the_turns_of_sinc_are_where_tan_z_is_z():
    for z in corners._TURNS:
        assert math.sin(z) - z * math.cos(z) == pytest.approx(0.0, abs=1e-14)


ANGLE_RULE = (
    "is out of range; it must be above 0 and at most 2 pi rad (360 degrees). "
    "Give the angle inside the plate, in rad."
)


@pytest.mark.parametrize(
    ("angle", "pair", "nu", "message"),
    [
        (0.0, (C, C), 0.3, f"corner angle 0 rad (0 degrees) {ANGLE_RULE}"),
        (math.nan, (C, C), 0.3, f"corner angle nan rad (nan degrees) {ANGLE_RULE}"),
        (
            math.radians(400.0),
            (S, F),
            0.3,
            f"corner angle 6.98132 rad (400 degrees) {ANGLE_RULE}",
        ),
        (
            1.0,
            (C, "hinged"),
            0.3,
            "unknown edge condition 'hinged' at a corner; the conditions are clamped, "
            "free, guided, simply supported. Use one of these words.",
        ),
        (
            1.0,
            (C, C, F),
            0.3,
            "a corner has two edges, not 3; give how the arriving and the leaving edge "
            "are held.",
        ),
        (
            1.0,
            (C, C),
            0.6,
            "nu = 0.6 at a corner; Poisson's ratio must lie between 0 and 0.5.",
        ),
    ],
)
def test_what_cannot_be_a_corner_is_refused(angle, pair, nu, message):
    for ask in (exponent, is_unbounded):
        with pytest.raises(InputError) as caught:
            ask(angle, pair, nu)
        assert str(caught.value) == message
