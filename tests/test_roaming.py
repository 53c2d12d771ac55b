"""A roaming patch: where it may stand, and the worst it does against brute force."""

import numpy as np
import pytest
import shapely
from plates import rectangle

from kplate.check import check
from kplate.choosing import choose_thickness
from kplate.errors import InputError
from kplate.extremes import corner_extreme
from kplate.loads import Case, DiscPatch, Pressure, RectanglePatch
from kplate.materials import STEEL
from kplate.outline import Outline
from kplate.panel import read_panel
from kplate.patches import Roaming, fits, placements
from kplate.placing import placed
from kplate.plate import Plate
from kplate.roaming import HOLD_DOWN, roam
from kplate.shapes import Circle, Rectangle
from kplate.solution import Solution
from kplate.solve.static import solve_static
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED

WHEEL = RectanglePatch(force=-1500.0, centre=(9.0, 9.0), size=(0.2, 0.2))
PIT = Plate(
    outline=Outline.polygon([(0, 0), (0.8, 0), (0.8, 0.6), (0, 0.6)]),
    thickness=0.006,
    material=STEEL,
    supports={f"side-{k}": SIMPLY_SUPPORTED for k in (1, 2, 3, 4)},
)
NOTCHED = Plate(
    outline=Outline.polygon(
        [(0, 0), (1.2, 0), (1.2, 0.6), (0.7, 0.6), (0.7, 0.9), (0, 0.9)]
    )
    .cut(Circle(centre=(0.3, 0.5), radius=0.08, name="pipe"))
    .zone(Rectangle(centre=(0.9, 0.3), size=(0.4, 0.4), name="pad"), name="pad"),
    thickness=0.008,
    material=STEEL,
    supports={
        "side-1": CLAMPED,
        "side-6": SIMPLY_SUPPORTED,
        "side-2": SIMPLY_SUPPORTED,
    },
)


@pytest.mark.parametrize(
    "patch",
    [
        RectanglePatch(force=-1.0, centre=(0, 0), size=(0.2, 0.1), angle=0.5),
        RectanglePatch(force=-1.0, centre=(0, 0), size=(0.1, 0.2)),
        DiscPatch(force=-1.0, centre=(0, 0), radius=0.09),
    ],
)
@pytest.mark.parametrize("zone", [None, "pad"])
def test_the_whole_patch_stays_where_it_may(patch, zone):
    roaming = Roaming(name="foot", patch=patch, step=0.07, zone=zone)
    places = placements(NOTCHED, roaming)
    region = NOTCHED.outline.region
    if zone:
        region = shapely.box(0.7, 0.1, 1.1, 0.5)
    assert len(places) > 4
    for place in places.tolist():
        own = roaming.at(tuple(place))
        shape = (
            shapely.Polygon(own.corners)
            if isinstance(own, RectanglePatch)
            else shapely.Point(own.centre).buffer(own.radius)
        )
        assert shape.difference(region).area < 1e-6
    for axis in (0, 1):
        steps = np.diff(np.unique(np.round(places[:, axis], 9)))
        assert steps.max() <= 0.07 * (1 + 1e-9)
    assert fits(NOTCHED, roaming, tuple(places[0].tolist()))
    assert not fits(NOTCHED, roaming, (0.3, 0.5))  # over the hole


def test_the_first_and_last_places_are_flush_with_the_edges():
    places = placements(PIT, Roaming(name="wheel", patch=WHEEL, step=0.25))
    np.testing.assert_allclose(np.unique(places[:, 0]), [0.1, 0.3, 0.5, 0.7])
    np.testing.assert_allclose(np.unique(places[:, 1]), [0.1, 0.3, 0.5])


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"step": -1.0}, "the step of 'wheel' is -1 m; it must be positive"),
        ({"step": 1e-4}, "makes 24010001 places; choose one that makes 20000 at most"),
        ({"zone": "pad"}, "no zone 'pad' to roam on; the zones are none"),
        (
            {"patch": RectanglePatch(force=-1.0, centre=(0, 0), size=(0.9, 0.1))},
            "the patch of 'wheel' does not fit on the plate; shrink it",
        ),
    ],
)
def test_bad_statements_are_refused(options, message):
    stated = {"name": "wheel", "patch": WHEEL, "step": 0.1} | options
    with pytest.raises(InputError, match=message):
        placements(PIT, Roaming(**stated))


def test_quantities_that_are_not_sought_are_refused():
    with pytest.raises(InputError, match="'shear stress' is not sought over places"):
        roam(
            PIT,
            Roaming(name="w", patch=WHEEL, step=0.3),
            quantities=("shear stress",),
        )


@pytest.fixture(scope="module")
def pit():
    return roam(PIT, Roaming(name="wheel", patch=WHEEL, step=0.25))


def test_the_worst_lies_between_the_places_of_a_coarse_lattice(pit):
    """S1 of the project's scenarios: 1.657 mm and 43 MPa with the wheel central.

    The lattice has no place at the middle of the long side; stencils find it. Corners
    pull most with the wheel towards them, 254 N against 155 N with it central.
    """
    worst = {own.quantity: own for own in pit.governing}
    w = worst["deflection"]
    assert w.place == pytest.approx((0.4, 0.3), abs=0.01)
    assert w.value.value == pytest.approx(-1.657e-3, rel=1e-3)
    assert abs(w.first.value) < 0.97 * abs(w.value.value)
    assert worst["von Mises"].value.value == pytest.approx(43e6, rel=0.02)
    pull = worst[HOLD_DOWN]
    assert pull.value.value == pytest.approx(254.0, rel=0.01)
    off = np.minimum(pull.place, np.array([0.8, 0.6]) - pull.place)
    np.testing.assert_allclose(off, (0.161, 0.161), atol=0.015)
    assert all(own.value.kind == "none" for own in pit.governing)


def test_places_that_govern_become_cases(pit):
    names = [(case.name, quantities) for case, quantities in pit.cases]
    assert ("wheel 1", ("deflection",)) in names or names[0][0] == "wheel 1"
    assert sum(len(quantities) for _, quantities in names) == 3
    for case, quantities in pit.cases:
        (patch,) = case.loads
        own = next(g for g in pit.governing if g.quantity == quantities[0])
        assert patch == RectanglePatch(force=-1500.0, centre=own.place, size=(0.2, 0.2))


def test_the_envelope_is_that_of_brute_force():
    """Every place of the lattice solved for itself, on the same mesh."""
    foot = DiscPatch(force=-800.0, centre=(0, 0), radius=0.07)
    weight = Pressure(-500.0)
    roaming = Roaming(name="foot", patch=foot, step=0.25, loads=(weight,))
    found = roam(NOTCHED, roaming, triangles=400, element="hct")
    own = found.solution
    at = found.points[::53]
    low, high, stress = [], [], []
    peaks = {"deflection": [], "von Mises": [], HOLD_DOWN: []}
    for place in found.places.tolist():
        case = Case(name="one", loads=[weight, roaming.at(tuple(place))])
        state = solve_static(NOTCHED, own.mesh, [case], element="hct")
        one = Solution(state=state)
        w = one.deflection(at)
        low.append(w)
        high.append(w)
        peaks["deflection"].append(abs(one.peak("deflection").value))
        peaks["von Mises"].append(one.peak("von Mises").value)
        peaks[HOLD_DOWN].append(corner_extreme(one, "hold-down", case="one")[0].value)
        stress.append(one.von_mises(at, face="top"))
    size = np.abs(low).max()
    np.testing.assert_allclose(
        found.lowest[::53], np.min(low, axis=0), atol=1e-9 * size
    )
    np.testing.assert_allclose(
        found.highest[::53], np.max(high, axis=0), atol=1e-9 * size
    )
    # Points on edges of triangles have the stress of either.
    off = np.abs(found.von_mises[::53] / np.max(stress, axis=0) - 1.0)
    assert np.median(off) < 1e-3
    for governing in found.governing:
        brute = np.nanmax(np.array(peaks[governing.quantity]), initial=0.0)
        assert abs(governing.first.value) == pytest.approx(brute, rel=0.02, abs=1e-9)
        assert abs(governing.value.value) >= abs(governing.first.value)
    assert found.solves >= len(found.places)
    worst = found.places[found.worst_place]
    assert np.hypot(*(worst - found.points).T).mean() < 0.5


def test_a_force_up_roams_too():
    up = RectanglePatch(force=300.0, centre=(0, 0), size=(0.1, 0.1))
    found = roam(
        rectangle(CLAMPED),
        Roaming(name="jack", patch=up, step=0.3),
        quantities=("deflection",),
        triangles=300,
    )
    assert found.governing[0].value.value > 0.0
    assert found.governing[0].place == pytest.approx((0.5, 0.5), abs=0.02)


PANEL = """
[panel]
name = "floor"
thickness = "6 mm"
material = "steel S235"
tolerance = "5 %"
[outline]
unit = "mm"
points = [[0, 0], [800, 0], [800, 600], [0, 600]]
sides = ["s", "e", "n", "w"]
[[zone]]
name = "lane"
rectangle = { centre = [400, 300], size = [400, 400] }
[supports]
s = "simply supported"
e = "simply supported"
n = "simply supported"
w = "simply supported"
[[case]]
name = "barrow"
roaming = { ROAMING }
[limits]
hold_down = "300 N"
"""
ROAMING = 'force = "1.5 kN down", over = "200 mm x 200 mm", step = "250 mm"'


DISC = 'force = "1 kN down", over = "disc 100 mm"'


def panel_file(tmp_path, roaming=ROAMING, more=""):
    path = tmp_path / "floor.toml"
    text = PANEL.replace("ROAMING", roaming)
    path.write_text(text + more, "utf-8")
    return path


def test_a_panel_is_checked_where_its_wheel_governs(tmp_path):
    checked = check(panel_file(tmp_path), out=tmp_path / "out")
    assert checked.status == 0
    pulls = [line for line in checked.lines if line.quantity == "corner hold-down"]
    assert max(line.value.value for line in pulls) == pytest.approx(254.0, rel=0.01)
    assert all(line.value.kind == "indicator" for line in pulls)
    assert (
        "roaming barrow: 12 places on the panel, 250 mm apart at most" in checked.text
    )
    assert "The worst of the places tried, no bound over all of them" in checked.text
    assert '"quantity": "hold-down"' in (tmp_path / "out" / "floor.json").read_text()


def test_a_thickness_is_chosen_where_the_wheel_governs(tmp_path):
    """Deflections of 3.49 and 2.86 mm with the wheel central at 5 mm and less."""
    path = panel_file(tmp_path)
    text = path.read_text("utf-8").replace(
        'hold_down = "300 N"',
        'deflection = { at_most = "3 mm" }\nstock = ["4 mm", "5 mm", "6 mm"]',
    )
    path.write_text(text, "utf-8")
    sized = choose_thickness(path)
    assert sized.sizing.thinnest.nominal == pytest.approx(0.005)
    assert "roaming barrow: 12 places" in sized.text
    assert "at the thickness stated" in sized.text


def test_a_roaming_case_and_combinations_do_not_mix(tmp_path):
    more = """
[[combination]]
name = "all"
purpose = "strength"
factors = { barrow = 1.5 }
"""
    with pytest.raises(InputError, match="case 'barrow' roams, and there are combin"):
        read_panel(panel_file(tmp_path, more=more))
    both = ROAMING + ' }\nreverses = "yes"\nloads = [{ self_weight = "down" }]#'
    with pytest.raises(InputError, match="a patch that roams acts one way"):
        read_panel(panel_file(tmp_path, both))


def test_a_wheel_may_roam_over_a_zone_with_loads_beside_it(tmp_path):
    roaming = 'force = "1 kN down", over = "disc 100 mm", on = "lane", step = "100 mm"'
    path = panel_file(tmp_path, roaming + ' }\nloads = [{ pressure = "1 kPa down" }]#')
    panel = read_panel(path)
    (own,) = panel.roaming
    assert own.zone == "lane"
    assert own.patch == DiscPatch(force=-1e3, centre=(0.0, 0.0), radius=0.05)
    assert own.loads == (Pressure(-1e3),)
    assert panel.cases == ()
    for case in placed(panel).panel.cases:
        x, y = case.loads[1].centre
        assert 0.25 <= x <= 0.55
        assert 0.15 <= y <= 0.45


@pytest.mark.parametrize(
    ("roaming", "message"),
    [
        ('over = "100 mm x 100 mm", step = "1 m"', "force"),
        ('force = "1 kN", over = "disc 100 mm", step = "1 m"', "up or down"),
        ('force = "1 kN down", step = "1 m"', "over"),
        ('force = "1 kN down", over = "disc 100 mm"', "step"),
        (
            'force = "1 kN down", over = "disc 1 m", step = "0.1 m", angle = "1 deg"',
            "turned",
        ),
        ('force = "1 kN down", over = "disc 1 m", step = "0.1 m", on = "lne"', "lane"),
    ],
)
def test_bad_roaming_is_refused_by_its_field(tmp_path, roaming, message):
    with pytest.raises(InputError, match=message) as caught:
        read_panel(panel_file(tmp_path, roaming))
    assert str(caught.value).startswith("[[case]] 1 'barrow' roaming")
    assert "\n" not in str(caught.value)
