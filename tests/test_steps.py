"""Steps of thickness and material: exact strips, and a series of two zones.

The step runs straight across the plate between two sections about one middle plane.
Moments across it go on, curvatures and moments along it jump.
"""

from itertools import pairwise

import numpy as np
import oracles
import pytest
from oracles_series import Band, banded
from plates import SIDES
from scipy.interpolate import PPoly

from kplate.adapt import solve
from kplate.choice import choose
from kplate.errors import InputError
from kplate.loads import Case, EdgeMoment, LineForce, Pressure
from kplate.materials import Isotropic
from kplate.meshing import mesh_outline
from kplate.outline import Outline
from kplate.plate import Plate, Section
from kplate.polygon import Polygon
from kplate.refine import refined
from kplate.solution import Solution
from kplate.solve.static import solve_static
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED

HAIR = 1e-9  # m, to one side of the step


def box(low, high):
    """Corners of a rectangle from its lowest and its highest."""
    (x0, y0), (x1, y1) = low, high
    return [(x0, y0), (x1, y0), (x1, y1), (x0, y1)]


# A strip along x with nu = 0: a beam, whatever its width.

LENGTH, WIDTH, LOADED, STEP = 2.0, 0.6, 0.41, 0.83
KNOTS = np.array([0.0, LOADED, STEP, LENGTH])
SOFT = Isotropic(name="soft", E=70e9, nu=0.0)
STIFF = Isotropic(name="stiff", E=210e9, nu=0.0)
BEAM_D = np.array([SOFT.bending_stiffness(0.012)] * 2 + [STIFF.bending_stiffness(0.02)])


def strip():
    """Simply supported at both ends, from soft to stiff; lines to load across it."""
    zone = Polygon(points=box((STEP, 0), (LENGTH, WIDTH)), sides=list("abcd"))
    outline = (
        Outline.polygon(box((0, 0), (LENGTH, WIDTH)), sides=SIDES)
        .zone(zone, name="stiff")
        .seam([(LOADED, 0), (LOADED, WIDTH)], name="line")
        .seam([(STEP, 0), (STEP, WIDTH)], name="step")
    )
    return Plate(
        outline=outline,
        thickness=0.012,
        material=SOFT,
        supports={"west": SIMPLY_SUPPORTED, "east": SIMPLY_SUPPORTED},
        zones={"stiff": Section(thickness=0.02, material=STIFF)},
    )


def under_line(force, place):
    """Moments at the knots under a line force, positive up, at one of them."""
    left, right = KNOTS / place, (LENGTH - KNOTS) / (LENGTH - place)
    return -force * place * (LENGTH - place) / LENGTH * np.minimum(left, right)


# Name: loads; moments m_xx at the knots, linear between them.
BENT = {
    "moments at both ends": (
        [
            EdgeMoment(moment=300.0, along="west"),
            EdgeMoment(moment=300.0, along="east"),
        ],
        np.full(4, 300.0),
    ),
    "moment at one end": (
        [EdgeMoment(moment=500.0, along="east")],
        500.0 * KNOTS / LENGTH,
    ),
    "line": ([LineForce(force=-900.0, along="line")], under_line(-900.0, LOADED)),
    "line on the step": (
        [LineForce(force=-900.0, along="step")],
        under_line(-900.0, STEP),
    ),
}


def beam(moments):
    """Deflection of the strip as a function of x; D w'' = m, w = 0 at both ends."""
    gain = np.diff(moments) / np.diff(KNOTS)
    w = PPoly(np.stack([gain, moments[:-1]]) / BEAM_D, KNOTS).antiderivative(2)
    return lambda x, order=0: w(x, order) - w(LENGTH) / LENGTH * [x, 1.0][order]


@pytest.fixture(scope="module", params=[0.25, 0.1], ids=["coarse", "fine"])
def bent_strip(request):
    plate = strip()
    mesh = mesh_outline(plate.outline, size=request.param)
    cases = [Case(name=name, loads=loads) for name, (loads, _) in BENT.items()]
    return Solution(state=solve_static(plate, mesh, cases, element="hct"))


@pytest.mark.parametrize("case", BENT)
def test_a_strip_with_a_step_is_bent_exactly(bent_strip, case):
    """Piecewise cubic deflection and its slope, on any mesh that follows the lines."""
    w = beam(BENT[case][1])
    x = np.linspace(0.0, LENGTH, 83)
    places = np.column_stack([x, WIDTH * np.modf(7.31 * x)[0]])
    deflection, slopes = w(x), w(x, 1)
    found = bent_strip.deflection(places, case=case)
    np.testing.assert_allclose(found, deflection, atol=1e-11 * np.ptp(deflection))
    found = bent_strip.slopes(places, case=case)
    np.testing.assert_allclose(found[:, 0], slopes, atol=1e-10 * np.ptp(slopes))
    np.testing.assert_allclose(found[:, 1], 0.0, atol=1e-10 * np.ptp(slopes))


@pytest.mark.parametrize("case", BENT)
def test_its_moments_are_right_everywhere_and_on_both_sides_of_the_step(
    bent_strip, case
):
    given = BENT[case][1]
    close = {"rtol": 0.0, "atol": 1e-8 * np.abs(given).max()}
    fields = bent_strip.point_fields(case=case)["moments [N]"]
    exact = np.interp(bent_strip.field_points[:, 0], KNOTS, given)
    np.testing.assert_allclose(fields[:, 0], exact, **close)
    np.testing.assert_allclose(fields[:, 1:], 0.0, **close)
    for side in (-HAIR, HAIR):
        places = np.column_stack([np.full(31, STEP + side), np.linspace(0, WIDTH, 31)])
        moments = bent_strip.moments(places, case=case)
        np.testing.assert_allclose(moments[:, 0], given[2], **close)


@pytest.mark.parametrize("case", BENT)
def test_its_shears_jump_where_the_load_is_and_nowhere_else(bent_strip, case):
    """q_x = -m_xx,x on each stretch between the lines, up to a hair from them."""
    given = BENT[case][1]
    gain = np.diff(given) / np.diff(KNOTS)
    for k, (start, end) in enumerate(pairwise(KNOTS)):
        x = np.linspace(start + HAIR, end - HAIR, 9)
        places = np.column_stack([x, np.linspace(0.05, 0.55, 9)])
        shears = bent_strip.shears(places, case=case)
        close = {"rtol": 0.0, "atol": 1e-8 * np.abs(given).max() / WIDTH}
        np.testing.assert_allclose(shears[:, 0], -gain[k], **close)
        np.testing.assert_allclose(shears[:, 1], 0.0, **close)


@pytest.mark.parametrize("case", BENT)
def test_its_ends_carry_what_a_beam_s_do(bent_strip, case):
    """The slope of the moments; in all, what the load is."""
    given = BENT[case][1]
    shear = np.diff(given) / np.diff(KNOTS)
    expected = {"west": shear[0] * WIDTH, "east": -shear[-1] * WIDTH}
    reactions = bent_strip.reactions(case=case)
    assert reactions.imbalance < 1e-10
    assert {side.side for side in reactions.sides} == set(expected)
    for side in reactions.sides:
        force = expected[side.side]
        assert side.resultant.force == pytest.approx(force, rel=1e-9, abs=1e-6)


def test_the_quintic_is_wrong_at_a_step_on_any_mesh_and_refused():
    """One curvature at a vertex: a moment 5 % off the strip's uniform 300 N."""
    plate = strip()
    case = Case(name="moments", loads=BENT["moments at both ends"][0])
    for size in (0.2, 0.1, 0.05):
        mesh = mesh_outline(plate.outline, size=size)
        state = solve_static(plate, mesh, [case], element="quintic")
        moments = Solution(state=state).point_fields()["moments [N]"]
        assert np.abs(moments[:, 0] - 300.0).max() > 0.05 * 300.0
    with pytest.raises(InputError, match="the quintic would give wrong moments: thick"):
        solve(plate, [case], element="quintic")
    assert choose(plate).element == "hct"


# A plate of aluminium welded to one of steel, the weld off the middle: x = 0 and 1
# simply supported, y = 0 clamped, the far end free.

LOW, HIGH, PRESSURE = 0.45, 1.3, -4e3
ALLOY = Isotropic(name="alloy", E=70e9, nu=0.33)
STEEL = Isotropic(name="steel", E=210e9, nu=0.28)
THICKNESS = (0.012, 0.007)
BANDS = [
    Band(
        width=width,
        rigidity=material.bending_stiffness(h),
        nu=material.nu,
        pressure=PRESSURE,
    )
    for width, h, material in zip(
        (LOW, HIGH - LOW), THICKNESS, (ALLOY, STEEL), strict=True
    )
]


def welded():
    zone = Polygon(points=box((0, LOW), (1, HIGH)), sides=list("abcd"))
    return Plate(
        outline=Outline.polygon(box((0, 0), (1, HIGH)), sides=SIDES).zone(
            zone, name="steel"
        ),
        thickness=THICKNESS[0],
        material=ALLOY,
        supports={
            "south": CLAMPED,
            "east": SIMPLY_SUPPORTED,
            "west": SIMPLY_SUPPORTED,
        },
        zones={"steel": Section(thickness=THICKNESS[1], material=STEEL)},
    )


def exact(places, number):
    """State of the welded plate in its first or its second part."""
    band = BANDS[number]
    W = banded(np.asarray(places, dtype=float), number, BANDS, ("clamped", "free"))
    return oracles.State(derivatives=W, nu=band.nu, rigidity=band.rigidity)


def inside(number):
    """Places in one part, spread evenly and no nearer than 20 mm to the weld."""
    k = np.arange(1, 121)
    spread = np.column_stack(
        [np.modf(0.7548776662 * k)[0], np.modf(0.569840291 * k)[0]]
    )
    low, high = ((0.0, LOW), (LOW, HIGH))[number]
    return spread * [0.9, high - low - 0.04] + [0.05, low + 0.02]


# In the middle of the clamped side, N/m.
MOST_REACTION = 3.2e3
WELD = np.column_stack([[0.1, 0.25, 0.5, 0.8], np.full(4, LOW)])


def test_the_series_of_two_zones_meets_the_plate_s_equation_and_the_weld():
    """D lap lap w = p by differences; w, slope, m_yy and v_y go on at the weld."""
    below, above = exact(WELD, 0), exact(WELD, 1)
    np.testing.assert_allclose(below.w, above.w, rtol=1e-11)
    np.testing.assert_allclose(below.slopes, above.slopes, rtol=1e-10, atol=1e-13)
    np.testing.assert_allclose(below.moments[:, 1], above.moments[:, 1], rtol=1e-9)
    shears = below.effective_shears[:, 1], above.effective_shears[:, 1]
    np.testing.assert_allclose(*shears, rtol=1e-6, atol=1e-6 * np.abs(shears).max())
    assert np.abs(below.moments[:, 0] / above.moments[:, 0] - 1.0).min() > 0.3
    h, steps = 1e-3, np.array([-2, -1, 1, 2])
    for number, band in enumerate(BANDS):
        at = np.array([(0.3, 0.2), (0.3, 0.8)])[number]
        along, up = (
            exact(at + h * np.outer(steps, axis), number).derivatives
            for axis in np.eye(2)
        )
        weights = np.array([1, -8, 8, -1]) / (12 * h)
        fourth = along[3, 0] @ weights + 2 * along[1, 2] @ weights + up[0, 3] @ weights
        assert band.rigidity * fourth == pytest.approx(PRESSURE, rel=1e-6)


def test_two_zones_alike_are_one_plate():
    """Levy's series for the whole, from bands parted anywhere, in three even."""
    places = np.array([(0.5, 0.3), (0.2, 0.5), (0.5, 0.5), (0.7, 0.75), (0.4, 1.0)])
    load = oracles.LinearPressure(at_origin=-2.0)
    ends = ("clamped", "free")
    whole = oracles.levy(places, (1.0, 1.2), load, ends=ends, nu=0.2)
    parts = [Band(width=w, nu=0.2, pressure=-2.0) for w in (0.5, 0.3, 0.4)]
    for number, own in ((0, [0, 1, 2]), (1, [1, 2, 3]), (2, [4])):
        W = banded(places[own], number, parts, ends)
        state = oracles.State(derivatives=W, nu=0.2, rigidity=1.0)
        np.testing.assert_allclose(state.w, whole.w[own], rtol=1e-10)
        np.testing.assert_allclose(
            state.moments, whole.moments[own], rtol=1e-9, atol=1e-10
        )


@pytest.fixture(scope="module")
def solved_weld():
    return solve(welded(), [Pressure(PRESSURE)], triangles=3_000)


def test_a_welded_plate_deflects_and_bends_as_the_series_says(solved_weld):
    """Largest errors measured: 1.4e-6 of the most, 0.6 % of it, at the weld 0.06 %."""
    assert solved_weld.state.element.name == "Hsieh-Clough-Tocher triangle"
    states = [exact(inside(number), number) for number in (0, 1)]
    most_w = max(np.abs(state.w).max() for state in states)
    most_m = max(np.abs(state.moments).max() for state in states)
    energy = solved_weld.strain_energy()
    assert solved_weld.load_work() == pytest.approx(2.0 * energy, rel=1e-9)
    for number, state in enumerate(states):
        w = solved_weld.deflection(inside(number))
        m = solved_weld.moments(inside(number))
        np.testing.assert_allclose(w, state.w, rtol=0.0, atol=3e-6 * most_w)
        np.testing.assert_allclose(m, state.moments, rtol=0.0, atol=0.01 * most_m)
    for number, side in ((0, -HAIR), (1, HAIR)):
        m = solved_weld.moments(np.add(WELD, (0.0, side)))
        there = exact(WELD, number).moments
        np.testing.assert_allclose(m, there, rtol=0.0, atol=0.002 * most_m)


@pytest.mark.parametrize(
    ("name", "number", "starts"),
    [
        ("south", 0, [0.2, 0.3, 0.4, 0.5, 0.6, 0.7]),
        ("west", 0, [0.1, 0.2, 0.3]),
        ("west", 1, [0.55, 0.7, 0.85, 1.0]),
    ],
)
def test_its_line_reactions_are_those_of_the_series(solved_weld, name, number, starts):
    """Means over a tenth of a metre; largest error measured: 0.6 % of the most."""
    (side,) = (s for s in solved_weld.reactions().sides if s.side == name)
    axis = ("south", "west").index(name)
    order = np.argsort(side.stations[:, axis])
    fine = np.linspace(0.0, 0.1, 1001) + np.array(starts)[:, None]
    found = np.interp(fine, side.stations[order, axis], side.line_reaction[order])
    share, weight = np.polynomial.legendre.leggauss(4)
    along = np.add.outer(starts, 0.05 * (1.0 + share))
    places = np.zeros((along.size, 2))
    places[:, axis] = along.ravel()
    shears = -exact(places, number).effective_shears[:, 1 - axis]
    means = shears.reshape(along.shape) @ weight / 2.0
    assert found.mean(axis=1) == pytest.approx(means, abs=0.01 * MOST_REACTION)


def test_its_error_falls_faster_than_the_edges():
    """Halving them takes the deflection's error to a tenth, the moments' to a third."""
    plate, case = welded(), Case(name="pressure", loads=[Pressure(PRESSURE)])
    states = [exact(inside(number), number) for number in (0, 1)]
    mesh = mesh_outline(plate.outline, size=0.12)
    errors = []
    for _ in range(3):
        solution = Solution(state=solve_static(plate, mesh, [case], element="hct"))
        off_w, off_m = [], []
        for number, state in enumerate(states):
            off_w.append(solution.deflection(inside(number)) - state.w)
            off_m.append(solution.moments(inside(number)) - state.moments)
        errors.append([np.sqrt(np.mean(np.square(off))) for off in (off_w, off_m)])
        for _ in range(2):  # two bisections halve the size
            mesh = refined(mesh, np.ones(len(mesh.triangles), dtype=bool))
    shares = np.array(errors[1:]) / errors[:-1]
    assert (shares[:, 0] < 0.1).all()
    assert (shares[:, 1] < 0.35).all()
