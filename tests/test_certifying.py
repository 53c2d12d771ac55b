"""Solving to a tolerance: what is reached, by which meshes, and what is said of it."""

from dataclasses import dataclass, replace
from functools import lru_cache
from itertools import pairwise
from typing import Any

import numpy as np
import oracles
import pytest
from plates import grid, rectangle

from kplate import certifying
from kplate.adapt import default_goals, solve
from kplate.bands import certify
from kplate.certifying import refine_to
from kplate.errors import InputError, SolveError
from kplate.following import followed
from kplate.goals import (
    ClampingMoment,
    Deflection,
    Goal,
    LineReaction,
    MeanDeflection,
    Moment,
    Peak,
    Resultant,
    Shear,
)
from kplate.loads import (
    Case,
    Hydrostatic,
    PointForce,
    Pressure,
    PressureField,
    RectanglePatch,
)
from kplate.outline import Outline
from kplate.plate import Plate
from kplate.shapes import Circle, Rectangle
from kplate.solution import Solution
from kplate.supports import CLAMPED, FREE, SIMPLY_SUPPORTED

PRESSURE = -1e3
EVEN = oracles.LinearPressure(at_origin=PRESSURE)
CENTRE = (0.5, 0.5)


@dataclass(frozen=True, kw_only=True)
class Problem:
    """A plate, its loads and goals that have bounds."""

    plate: Plate
    loads: list[Any]
    goals: list[Goal]


def l_shape(support=CLAMPED):
    """Three unit squares about a re-entrant corner at (1, 1)."""
    outline = Outline.polygon(
        [(0, 0), (2, 0), (2, 1), (1, 1), (1, 2), (0, 2)], sides=list("abcdef")
    )
    held = dict.fromkeys("abcdef", support)
    return replace(rectangle(support), outline=outline, supports=held)


def notched():
    """Mixed edges, a notch with free sides, a post inside."""
    outline = Outline.polygon(
        [(0, 0), (1.6, 0), (1.6, 1), (1, 1), (1, 0.7), (0.7, 0.7), (0.7, 1), (0, 1)],
        sides=["south", "east", "north", "n1", "n2", "n3", "north-west", "west"],
    ).mark((1.3, 0.4), name="post")
    held = {
        "south": CLAMPED,
        "east": FREE,
        "north": SIMPLY_SUPPORTED,
        "west": SIMPLY_SUPPORTED,
        "post": SIMPLY_SUPPORTED,
    }
    return replace(rectangle(CLAMPED), outline=outline, supports=held)


PATCH = RectanglePatch(force=-400.0, centre=(0.5, 0.4), size=(0.2, 0.1), angle=0.4)
PROBLEMS = {
    "square": Problem(
        plate=rectangle(SIMPLY_SUPPORTED),
        loads=[Pressure(PRESSURE)],
        goals=[
            Deflection(at=CENTRE),
            MeanDeflection(),
            Moment(at=CENTRE, component="m_xx"),
            LineReaction(at=(0.0, 0.5)),
        ],
    ),
    "L-shape": Problem(
        plate=l_shape(),
        loads=[Pressure(PRESSURE)],
        goals=[
            Deflection(at=(0.7, 0.7)),
            Moment(at=CENTRE, component="m_xy"),
            ClampingMoment(at=(0.0, 0.6)),
        ],
    ),
    "notched": Problem(
        plate=notched(),
        loads=[Pressure(PRESSURE), PATCH],
        goals=[
            Deflection(at=(1.6, 1.0)),
            Deflection(at=(0.7, 0.85)),
            Moment(at=(0.3, 0.6), component="m_yy"),
            ClampingMoment(at=(0.4, 0.0)),
            Resultant(of="post"),
        ],
    ),
}
TOLERANCES = (0.01, 0.001)


@lru_cache
def solved(name, tolerance):
    problem = PROBLEMS[name]
    return solve(problem.plate, problem.loads, tolerance=tolerance, goals=problem.goals)


def half(value):
    return 0.5 * (value.upper - value.lower)


@pytest.mark.slow
@pytest.mark.parametrize("tolerance", TOLERANCES)
@pytest.mark.parametrize("name", PROBLEMS)
def test_every_goal_gets_inside_the_tolerance(name, tolerance):
    solution, goals = solved(name, tolerance), PROBLEMS[name].goals
    assert solution.reached
    assert solution.tolerance == tolerance
    for goal in goals:
        value = solution.value(goal)
        assert (value.kind, value.reason) == ("bound", "")
        assert half(value) <= tolerance * abs(value.value)
        assert solution.value(goal, case="load") == value
    assert len(solution.history[-1].bands) == len(goals)


@pytest.mark.slow
@pytest.mark.parametrize("name", PROBLEMS)
def test_narrow_bands_lie_across_wide_ones(name):
    """Both contain the truth, so that they meet."""
    wide, narrow = (solved(name, tolerance) for tolerance in TOLERANCES)
    for goal in PROBLEMS[name].goals:
        first, second = wide.value(goal), narrow.value(goal)
        assert max(first.lower, second.lower) <= min(first.upper, second.upper)
    assert wide.history[-1].unknowns <= narrow.history[-1].unknowns
    first, second = wide.energies[0], narrow.energies[0]
    assert max(first.lower, second.lower) <= min(first.upper, second.upper)


def test_the_bands_of_the_square_hold_navier_s_series():
    solution = solved("square", 0.01)
    state = oracles.navier([CENTRE, (0.0, 0.5)], (1, 1), EVEN, rigidity=1e4)
    deflection, _, moment, reaction = map(solution.value, PROBLEMS["square"].goals)
    for value, exact in (
        (deflection, state.w[0]),
        (moment, state.moments[0, 0]),
        (reaction, -state.effective_shears[1, 0]),
    ):
        assert value.lower <= exact <= value.upper


@pytest.mark.slow
@pytest.mark.parametrize("name", PROBLEMS)
def test_the_history_grows_in_unknowns_and_only_its_end_is_inside(name):
    solution = solved(name, 0.001)
    history = solution.history
    assert [step.reached for step in history] == [False] * (len(history) - 1) + [True]
    for before, after in pairwise(history):
        assert before.unknowns < after.unknowns
        assert before.triangles < after.triangles
        assert before.seconds < after.seconds
        for goal, band in after.bands.items():
            assert band <= before.bands[goal] * (1.0 + 1e-6)
        assert max(before.bands.values()) > 0.001
    assert max(history[-1].bands.values()) <= 0.001
    assert history[-1].triangles == len(solution.mesh.triangles)
    words = history[-1].words
    assert words.startswith(f"{history[-1].unknowns} unknowns, ")
    assert " deflection at (" in words


# From crude meshes, so that there are many steps.


def crude(plate, goals, mesh, tolerance, **options):
    case = Case(name="load", loads=[Pressure(PRESSURE)])
    return refine_to(
        plate, mesh, [case], goals, tolerance=tolerance, element="quintic", **options
    )


def l_mesh():
    """The L-shape in 24 triangles."""
    whole = grid(4, a=2.0, b=2.0)
    middles = whole.points[whole.triangles].mean(axis=1)
    triangles = whole.triangles[(middles < 1.0).any(axis=1)]
    used, number = np.unique(triangles, return_inverse=True)
    points, triangles = whole.points[used], number.reshape(-1, 3)
    edges = triangles[:, [[0, 1], [1, 2], [2, 0]]].reshape(-1, 2)
    outer = edges[~np.isin(edges @ [100, 1], edges @ [1, 100])]
    x, y = points[outer].mean(axis=1).T
    sides = [y == 0, x == 2, (y == 1) & (x > 1), (x == 1) & (y > 1), y == 2, x == 0]
    return replace(
        whole,
        points=points,
        triangles=triangles,
        boundary_edges=outer,
        boundary_sides=np.argmax(sides, axis=0),
        side_names=tuple("abcdef"),
        boundary_circles=None,
        zones=None,
    )


L_GOALS = [Deflection(at=CENTRE), Moment(at=(0.45, 0.45), component="m_xx")]
L_TOLERANCE = 0.002


@lru_cache
def l_run(budget=20_000):
    return crude(l_shape(), L_GOALS, l_mesh(), L_TOLERANCE, budget=budget)


@pytest.mark.slow
def test_bounds_of_all_meshes_are_nested_and_kept():
    """Runs that end earlier are the beginnings of the longest; no end moves out."""
    whole = l_run()
    assert whole.reached
    assert len(whole.history) >= 4
    runs = [l_run(step.unknowns) for step in whole.history[:-1]] + [whole]
    for earlier, later in pairwise(runs):
        assert not earlier.reached
        steps = later.history[: len(earlier.history)]
        assert [s.bands for s in steps] == [s.bands for s in earlier.history]
        for goal in L_GOALS:
            before, after = earlier.value(goal), later.value(goal)
            assert before.kind == after.kind == "bound"
            assert before.lower <= after.lower <= after.value
            assert after.value <= after.upper <= before.upper


def test_an_end_of_an_earlier_mesh_is_kept_where_it_is_the_better(monkeypatch):
    """As if the second mesh had half as wide a band again on the upper side."""
    plain, found = certifying.certify, []

    def widened(*given, **options):
        certified = plain(*given, **options)
        ((value,),) = certified.values
        found.append(value)
        if len(found) == 2:
            wider = found[0].upper + half(found[0])
            certified = replace(certified, values=((replace(value, upper=wider),),))
        return certified

    monkeypatch.setattr(certifying, "certify", widened)
    goal = MeanDeflection()
    first = crude(l_shape(), [goal], l_mesh(), 1e-4, budget=1).history[0].unknowns
    found.clear()
    solution = crude(l_shape(), [goal], l_mesh(), 1e-4, budget=first + 1)
    assert len(solution.history) == 2
    value = solution.value(goal)
    assert (value.lower, value.upper) == (found[1].lower, found[0].upper)


def test_a_spent_budget_leaves_the_bands_that_were_reached():
    first = l_run().history[0]
    spent = l_run(first.unknowns)
    assert not spent.reached
    assert [step.reached for step in spent.history] == [False]
    assert spent.tolerance == L_TOLERANCE
    for goal in L_GOALS:
        value, wanted = spent.value(goal), l_run().value(goal)
        assert half(value) > L_TOLERANCE * abs(value.value)
        assert value.lower <= wanted.lower <= wanted.upper <= value.upper
    problem = PROBLEMS["L-shape"]
    solution = solve(
        problem.plate, problem.loads, tolerance=1e-7, goals=problem.goals, budget=500
    )
    assert not solution.reached
    assert solution.history[-1].unknowns >= 500
    assert all(step.unknowns < 500 for step in solution.history[:-1])


def test_triangles_are_bisected_where_the_gaps_are():
    """At the re-entrant corner, where moments have no bound, and not at others."""
    mesh = l_run().mesh

    def smallest_at(place):
        vertex = int(np.hypot(*(mesh.points - place).T).argmin())
        return mesh.areas[(mesh.triangles == vertex).any(axis=1)].min()

    at_corner = smallest_at((1.0, 1.0))
    for other in ((2.0, 0.0), (2.0, 1.0), (0.0, 2.0)):
        assert smallest_at(other) > 100.0 * at_corner


def test_progress_tells_unknowns_and_bands_of_each_mesh():
    said = []
    solution = crude(
        rectangle(CLAMPED),
        [Deflection(at=CENTRE)],
        grid(2),
        1e-4,
        progress=lambda words, done: said.append((words, done)),
    )
    assert [words for words, _ in said] == [step.words for step in solution.history]
    assert said[-1][0].endswith(" %")
    assert "deflection at (0.5, 0.5)" in said[-1][0]
    done = [d for _, d in said]
    assert done == sorted(done)
    assert 0.0 < done[0] < done[-1] < 1.0


def test_a_number_that_is_nothing_beside_its_like_holds_nothing_up():
    """m_xy at the centre is 0 by symmetry: its band is a share of m_xx."""
    goals = [Moment(at=CENTRE, component=c) for c in ("m_xx", "m_xy")]
    solution = crude(rectangle(SIMPLY_SUPPORTED), goals, grid(2), 0.01)
    bending, twisting = map(solution.value, goals)
    assert solution.reached
    assert twisting.lower < 0.0 < twisting.upper
    assert half(bending) <= 0.01 * bending.value
    share = certifying.SMALL * bending.value
    assert abs(twisting.value) < half(twisting) <= 0.01 * share
    bands = solution.history[-1].bands
    assert list(bands) == ["m_xx at (0.5, 0.5)", "m_xy at (0.5, 0.5)"]
    widths = [half(bending) / bending.value, half(twisting) / share]
    assert list(bands.values()) == pytest.approx(widths)


def test_goals_of_the_same_words_are_told_by_the_widest():
    """Shears at one place in two directions; the words name the place alone."""
    goals = [Shear(at=(0.3, 0.4), direction=d) for d in ((1.0, 0.0), (0.6, 0.8))]
    found = []
    for order in (goals, goals[::-1]):
        solution = crude(rectangle(CLAMPED), order, grid(4), 0.5)
        widths = [half(v) / abs(v.value) for v in map(solution.value, order)]
        (band,) = solution.history[-1].bands.values()
        assert band == pytest.approx(max(widths))
        found.append(widths)
    assert found[0] == pytest.approx(found[1][::-1])


def test_nothing_is_reached_where_no_goal_has_a_band():
    """One mesh is solved, and the words say what is the case."""
    under = Moment(at=CENTRE, component="m_xx")
    load = PointForce(force=-100.0, at=CENTRE)
    told = []
    solution = solve(
        rectangle(CLAMPED),
        [load],
        tolerance=0.01,
        goals=[under],
        progress=lambda words, done: told.append(words),
    )
    (step,) = solution.history
    assert (step.bands, step.reached, solution.reached) == ({}, False, False)
    assert step.words.endswith(" s: no goal has a band")
    assert step.words in told


def test_a_peak_that_is_not_known_reaches_nothing():
    """The disc around the force covers the plate."""
    goals, force = [Peak(quantity="von Mises")], PointForce(force=1.0, at=CENTRE)
    solution = solve(
        rectangle(CLAMPED), [force], tolerance=0.05, goals=goals, excluded_radius=2.0
    )
    assert np.isnan(solution.peak("von Mises").value)
    assert not solution.reached
    assert solution.history[-1].bands == {}


def test_every_case_gets_inside_and_the_widest_is_told():
    cases = [
        Case(name="even", loads=[Pressure(PRESSURE)]),
        Case(name="force", loads=[PointForce(force=-100.0, at=CENTRE)]),
    ]
    goal = Deflection(at=(0.25, 0.5))
    solution = refine_to(
        rectangle(CLAMPED), grid(4), cases, [goal], tolerance=1e-3, element="quintic"
    )
    assert solution.reached
    shares = []
    for case in ("even", "force"):
        value = solution.value(goal, case=case)
        assert value.case == case
        shares.append(half(value) / abs(value.value))
    assert max(shares) <= 1e-3
    (band,) = solution.history[-1].bands.values()
    assert band == pytest.approx(max(shares))
    with pytest.raises(InputError, match="there are 2 load cases; name one of even"):
        solution.value(goal)


def test_a_goal_without_a_bound_holds_nothing_up_and_has_no_band_to_tell():
    under = Moment(at=CENTRE, component="m_xx")
    case = Case(name="force", loads=[PointForce(force=-100.0, at=CENTRE)])
    goals = [under, Deflection(at=CENTRE)]
    solution = refine_to(
        rectangle(CLAMPED), grid(4), [case], goals, tolerance=0.01, element="quintic"
    )
    assert solution.reached
    value = solution.value(under)
    assert value.kind == "none"
    assert value.reason == "a point load leaves no room around it"
    assert list(solution.history[-1].bands) == ["deflection at (0.5, 0.5)"]


def test_what_was_not_asked_for_is_refused():
    solution = crude(rectangle(CLAMPED), [Deflection(at=CENTRE)], grid(4), 0.1)
    with pytest.raises(InputError) as caught:
        solution.value(Resultant(of="south"))
    assert str(caught.value) == (
        "Resultant(of='south') was not asked for; call solve(..., tolerance=..., "
        "goals=[...])."
    )


@pytest.mark.parametrize("tolerance", [0.0, 1.0, -0.01, float("nan")])
def test_tolerances_that_are_no_shares_are_refused(tolerance):
    with pytest.raises(InputError) as caught:
        solve(rectangle(CLAMPED), [Pressure(1.0)], tolerance=tolerance)
    assert str(caught.value) == (
        f"the tolerance is {tolerance:g}; it must lie between 0 and 1."
    )


def test_a_mesh_that_fails_leaves_the_bands_of_those_before_it(monkeypatch):
    """Round-off, where triangles have become too small; not on the first mesh."""
    plain, count = certifying.certify, [0]

    def failing(*given, **options):
        count[0] += 1
        if count[0] == 3:
            raise SolveError("round-off")
        return plain(*given, **options)

    monkeypatch.setattr(certifying, "certify", failing)
    given = (rectangle(CLAMPED), [Deflection(at=CENTRE)], grid(2), 1e-4)
    solution = crude(*given)
    assert not solution.reached
    assert len(solution.history) == 2
    value = solution.value(Deflection(at=CENTRE))
    assert value.kind == "bound"
    (band,) = solution.history[-1].bands.values()
    assert band == pytest.approx(half(value) / abs(value.value))
    count[0] = 2
    with pytest.raises(SolveError, match="round-off"):
        crude(*given)


# Peaks.


def square_peaks():
    """Peaks of the simply supported square.

    The largest principal stress is at the centre; von Mises's in the corners, where
    m_xy alone acts, half the corner force; the shear in the middle of the sides.
    """
    state = oracles.navier([CENTRE, (0.0, 0.5), (0, 0)], (1, 1), EVEN, rigidity=1e4)
    h = PROBLEMS["square"].plate.thickness
    m_xy = abs(state.moments[2, 2])
    return {
        "deflection": state.w[0],
        "m_xx": state.moments[0, 0],
        "m_xy": m_xy,
        "von Mises": 6.0 * 3.0**0.5 * m_xy / h**2,
        "largest principal": 6.0 * state.moments[0, 0] / h**2,
        "shear stress": 1.5 * abs(state.shears[1, 0]) / h,
    }


def test_bands_of_peaks_hold_those_of_the_series():
    exact, problem = square_peaks(), PROBLEMS["square"]
    goals = [Peak(quantity=quantity) for quantity in exact]
    solution = solve(problem.plate, problem.loads, tolerance=0.01, goals=goals)
    assert solution.reached
    for goal in goals:
        peak, known = solution.peak(goal.quantity), exact[goal.quantity]
        assert solution.value(goal) == peak
        assert peak.kind == "estimate"
        low, high = sorted((abs(peak.lower), abs(peak.upper)))
        assert low <= abs(known) <= high, goal
        assert half(peak) <= 0.01 * abs(peak.value)
    assert solution.peak("deflection").value < 0.0  # with its sign, as is its band
    assert solution.peak("deflection").upper < 0.0


def test_the_band_of_a_peak_holds_it_between_the_samples_too():
    """The centre of the square, which is no vertex of these meshes."""
    plate, case = (
        rectangle(SIMPLY_SUPPORTED),
        Case(name="p", loads=[Pressure(PRESSURE)]),
    )
    for n in (8, 12, 20):
        mesh = grid(n)
        pull = 0.04 * np.sin(np.pi * mesh.points) * [1.0, -1.7]
        mesh = replace(mesh, points=mesh.points + pull)
        found = certify(plate, mesh, [case], (), element="quintic")
        peak = Solution(state=found.state, dual=found.dual).peak("m_xx")
        assert peak.lower <= square_peaks()["m_xx"] <= peak.upper, n


@pytest.mark.slow
def test_bands_of_peaks_hold_what_a_much_finer_mesh_finds():
    """On the rim of the disc around a re-entrant corner, and under a patch."""
    for name in ("L-shape", "notched"):
        problem, given = PROBLEMS[name], {"excluded_radius": 0.05}
        goals = [Peak(quantity="deflection"), Peak(quantity="von Mises")]
        solution = solve(
            problem.plate, problem.loads, tolerance=0.03, goals=goals, **given
        )
        fine = solve(problem.plate, problem.loads, triangles=8_000, **given)
        assert solution.reached
        assert len(fine.mesh.triangles) > 4 * len(solution.mesh.triangles)
        for goal in goals:
            peak, known = (s.peak(goal.quantity) for s in (solution, fine))
            assert (peak.kind, known.kind) == ("estimate", "none")
            assert peak.lower <= known.value <= peak.upper, (name, goal)
            assert half(peak) <= 0.03 * abs(peak.value)


def test_the_peak_is_among_the_triangles_that_may_hold_it():
    solution = solved("square", 0.01)
    at = solution.peak("von Mises")
    band = solution.peak_band("von Mises")
    places = solution.mesh.points[solution.mesh.triangles[band.candidates]]
    assert np.hypot(*(places.reshape(-1, 2) - at.place).T).min() < 0.2
    assert band.lower <= at.value <= band.upper
    # In all four corners, and far from the centre.
    for corner in ((0, 0), (1, 0), (1, 1), (0, 1)):
        assert np.hypot(*(places.reshape(-1, 2) - corner).T).min() < 1e-9
    assert np.hypot(*(places.reshape(-1, 2) - CENTRE).T).min() > 0.3


def test_peaks_have_no_band_on_a_single_mesh():
    solution = solve(rectangle(CLAMPED), [Pressure(1.0)], triangles=50)
    assert solution.peak("von Mises").kind == "none"
    message = "a peak has a band only where balanced moments were found too"
    with pytest.raises(InputError, match=message):
        solution.peak_band("von Mises")
    assert not solution.reached
    assert solution.history == ()


def test_without_goals_peaks_and_the_forces_of_supports_are_wanted():
    plate = notched()
    assert default_goals(plate) == (
        Peak(quantity="deflection"),
        Peak(quantity="von Mises"),
        Resultant(of="south"),
        Resultant(of="north"),
        Resultant(of="west"),
        Resultant(of="post"),
    )
    stress = "largest principal"
    assert default_goals(plate, stress)[1] == Peak(quantity=stress)


@pytest.mark.slow
def test_a_plate_is_solved_for_them():
    """The peak deflection also as a bound, at a vertex where it is."""
    held = {"south": CLAMPED, "north": SIMPLY_SUPPORTED}
    plate = replace(rectangle(held), thickness=0.05)
    solution = solve(plate, [Pressure(PRESSURE)], tolerance=0.01)
    assert solution.reached
    bands = solution.history[-1].bands
    assert {"peak deflection", "peak von Mises", "resultant of south"} <= set(bands)
    south, north = (solution.value(Resultant(of=s)) for s in ("south", "north"))
    assert south.kind == north.kind == "bound"
    assert south.lower + north.lower <= -PRESSURE <= south.upper + north.upper
    (top,) = (goal for goal, _ in solution.known if isinstance(goal, Deflection))
    value, peak = solution.value(top), solution.peak("deflection")
    assert value.kind == "bound"
    assert top.at[0] in (0.0, 1.0)  # in the middle of a free side, either of them
    assert peak.place[1] == pytest.approx(top.at[1], abs=0.05)
    assert value.value == pytest.approx(peak.value, rel=0.01)


# What the mesh follows.

OUTLINE = rectangle(CLAMPED).outline


def follow(outline, loads, goals=()):
    """Seams' points and marks' places that are added, by their names."""
    cases = [Case(name=f"case {k}", loads=[load]) for k, load in enumerate(loads)]
    found = followed(outline, cases, goals)
    seams = {seam.name: seam.points for seam in found.seams[len(outline.seams) :]}
    marks = {mark.name: mark.at for mark in found.marks[len(outline.marks) :]}
    assert followed(found, cases, goals).marks == found.marks
    return seams, marks


def patch(centre, size, angle=0.0):
    return RectanglePatch(force=1.0, centre=centre, size=size, angle=angle)


def test_point_forces_and_deflections_are_marked_once():
    """And not where a vertex of the outline is already."""
    places = ((0.3, 0.3), (0.0, 0.0), (1.0, 0.4))
    loads = [PointForce(force=1.0, at=at) for at in places]
    goals = [Deflection(at=at) for at in ((0.3, 0.3), (0.7, 0.7), (1.0, 1.0))]
    goals += [Moment(at=(0.6, 0.6), component="m_xx")]
    seams, marks = follow(OUTLINE, loads, goals)
    assert seams == {}
    assert marks == {
        "load point 1": (0.3, 0.3),
        "load point 2": (1.0, 0.4),
        "load point 3": (0.7, 0.7),
    }


def test_the_outline_of_a_patch_becomes_a_seam_once():
    turned = patch((0.6, 0.6), (0.2, 0.1), 0.3)
    loads = [patch((0.3, 0.3), (0.2, 0.1)), patch((0.3, 0.3), (0.2, 0.1)), turned]
    seams, marks = follow(OUTLINE, loads)
    assert marks == {}
    assert list(seams) == ["load line 1", "load line 2"]
    for seam, load in zip(seams.values(), loads[1:], strict=True):
        np.testing.assert_allclose(seam, [*load.corners, load.corners[0]], atol=1e-15)


def test_the_surface_of_a_liquid_becomes_seams_where_it_crosses_the_plate():
    hole = OUTLINE.cut(Circle(centre=CENTRE, radius=0.1, name="hole"))
    level = Hydrostatic(level=0.5, specific_weight=1.0)
    seams, _ = follow(hole, [level])
    ends = sorted(sorted(seam[:, 0].round(9).tolist()) for seam in seams.values())
    assert ends == [[0.0, 0.4], [0.6, 1.0]]
    assert all((seam[:, 1] == 0.5).all() for seam in seams.values())
    aslant = Hydrostatic(level=0.5**0.5 / 2.0, specific_weight=1.0, up=(3.0, 3.0))
    (seam,) = follow(OUTLINE, [aslant])[0].values()
    np.testing.assert_allclose(seam.sum(axis=1), 0.5)
    drowned = Hydrostatic(level=3.0, specific_weight=1.0)
    assert follow(OUTLINE, [drowned]) == ({}, {})


def test_what_does_not_fit_is_left_out():
    """A patch over a side or over a hole, a force beside the plate."""
    hole = OUTLINE.cut(Rectangle(centre=CENTRE, size=(0.3, 0.6), name="slot"))
    loads = [
        patch((0.95, 0.5), (0.2, 0.2)),
        patch((0.5, 0.5), (0.4, 0.4)),
        PointForce(force=1.0, at=(0.5, 1.5)),
    ]
    assert follow(hole, loads) == ({}, {})


def test_names_that_are_taken_are_passed_over():
    """Else a deflection would be left without its vertex, and its band no bound."""
    box = Rectangle(centre=(0.8, 0.8), size=(0.1, 0.1), name="box")
    outline = OUTLINE.mark((0.1, 0.1), name="load point 2")
    outline = outline.seam([(0.2, 0.1), (0.8, 0.1)], name="load line 1")
    outline = outline.zone(box, name="load point 1")
    seams, marks = follow(outline, [patch(CENTRE, (0.2, 0.2))], [Deflection(at=CENTRE)])
    assert list(seams) == ["load line 2"]
    assert marks == {"load point 3": CENTRE}


def test_what_is_followed_is_no_support_and_no_part_of_the_plate():
    load, goal = patch((0.4, 0.4), (0.2, 0.2)), Deflection(at=(0.6, 0.7))
    solution = solve(rectangle(CLAMPED), [load], tolerance=0.05, goals=[goal])
    assert solution.plate.outline.seams == ()
    assert solution.plate.outline.marks == ()
    mesh = solution.mesh
    assert mesh.seam_names == ("load line 1",)
    assert mesh.mark_names == ("load point 1",)
    middles = mesh.points[mesh.seam_edges].mean(axis=1)
    assert (solution.deflection(middles) > 0.0).all()
    assert solution.value(goal).kind == "bound"


def test_a_stated_function_ends_in_an_estimate():
    """Of which samples are known only; the reason is on the value."""
    wave = PressureField(lambda x, y: PRESSURE * np.cos(9.0 * x * y))
    goal = Deflection(at=CENTRE)
    solution = solve(rectangle(CLAMPED), [wave], tolerance=0.01, goals=[goal])
    value = solution.value(goal)
    assert solution.reached
    assert value.kind == "estimate"
    reason = "a pressure is stated as a function, of which samples are known"
    assert value.reason == reason
