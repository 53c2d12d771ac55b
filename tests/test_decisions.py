"""Whole decisions on three invented panels, with limits and combinations.

Values: Navier series (cover, pane) and Ritz (tank wall), computed without finite
elements; the series are also those of tests/oracles.py.
"""

import csv
from pathlib import Path

import pytest

from kplate.check import check
from kplate.limits import Outcome

MESHES = Path(__file__).parents[1] / "meshes"


def panel(tmp_path, name, *changes, more=""):
    """A panel file of the gallery with some text changed, and more at its end."""
    text = (MESHES / f"{name}.toml").read_text("utf-8")
    for old, new in changes:
        assert text.count(old) >= 1, old
        text = text.replace(old, new)
    path = tmp_path / f"{name}.toml"
    path.write_text(f"{text}\n{more}", "utf-8")
    return path


def rows(checked, quantity):
    return [line for line in checked.lines if line.quantity == quantity]


def row(checked, quantity):
    (only,) = rows(checked, quantity)
    return only


def cover(tmp_path, thickness):
    """The pump-pit cover: alone or together, the screws hold 250 N each."""
    return check(
        panel(
            tmp_path,
            "pit-cover",
            ('thickness = "6 mm"', f'thickness = "{thickness} mm"'),
            ("[limits]", '[limits]\nhold_down = { corners = "250 N" }'),
            more="""
[[case]]
name = "weight"
loads = [{ self_weight = "down" }]

[[combination]]
name = "crowd"
purpose = "service"
factors = { uniform = 1.0 }

[[combination]]
name = "trolley"
purpose = "service"
factors = { wheel = 1.0 }

[[combination]]
name = "crowd, as stated"
purpose = "strength"
factors = { uniform = 1.0 }

[[combination]]
name = "trolley, as stated"
purpose = "strength"
factors = { wheel = 1.0 }

[[combination]]
name = "pull"
purpose = "uplift"
factors = { weight = 1.1, wheel = 1.5 }

[[ask]]
name = "centre"
at = [400, 300]
values = ["deflection", "m_xx", "von Mises"]
""",
        )
    )


@pytest.mark.parametrize(
    ("thickness", "w", "stress", "outcome"),
    [(4, 5.591, 97.0, Outcome.FAILS), (5, 2.863, 62.0, Outcome.PASSES)],
)
def test_the_pit_cover_needs_5_mm(tmp_path, thickness, w, stress, outcome):
    """Stiffness governs; the wheel does; corner pull 155.2 N of it (series)."""
    checked = cover(tmp_path, thickness)
    deflection = row(checked, "peak deflection")
    assert deflection.case == "trolley"
    assert abs(deflection.value.value) == pytest.approx(w * 1e-3, rel=2e-3)
    assert deflection.judgement.outcome is outcome
    found = row(checked, "peak von Mises")
    assert found.case == "trolley, as stated"
    assert found.value.value == pytest.approx(stress * 1e6, rel=0.01)
    assert checked.verdict.outcome is outcome
    # 1.5 x 155.2 N of the wheel, and 1.1 x 6.1 % of the weight at each corner.
    weight = 7850 * 9.80665 * 0.8 * 0.6 * thickness * 1e-3
    pull = row(checked, "corner hold-down")
    assert pull.case == "pull"
    assert pull.value.value == pytest.approx(
        1.5 * 155.2 + 1.1 * 0.0609 * weight, rel=5e-3
    )
    limit = 250.0
    assert (pull.judgement.outcome is Outcome.PASSES) == (pull.value.upper <= limit)


def test_values_asked_for_in_a_combination_have_bounds(tmp_path):
    checked = cover(tmp_path, 6)
    centre = {
        value.case: value
        for (goal, _), value in checked.judged.solution.known.items()
        if type(goal).__name__ == "Deflection" and goal.at == (0.4, 0.3)
    }
    for case, w in (("crowd", 1.034), ("trolley", 1.657)):
        assert centre[case].kind == "bound"
        assert centre[case].lower <= -w * 1e-3 * 0.9995
        assert -w * 1e-3 * 1.0005 <= centre[case].upper
    # Factors superpose: 1.5 of the wheel and 1.1 of the weight.
    weight = 1.034 * 7850 * 9.80665 * 0.006 / 5e3
    pull = centre["pull"].value
    assert -pull == pytest.approx((1.5 * 1.657 + 1.1 * weight) * 1e-3, rel=1e-3)


TANK = """
[[case]]
name = "empty and full"
loads = [{ liquid = "1000 kg/m^3", level = "450 mm", pushes = "down" }]

[[combination]]
name = "full"
purpose = "service"
factors = { %(case)s = 1.0 }

[[combination]]
name = "half"
purpose = "service"
factors = { "empty and full" = 1.0 }

[[combination]]
name = "full, factored"
purpose = "strength"
factors = { %(case)s = 1.2 }
"""


def test_the_tank_wall_of_6_mm_passes_with_its_factored_water(tmp_path):
    """Ritz: w 1.3832 mm, foot edge 309.6 N, 51.6 MPa at 6 mm; total 4767.7 N."""
    text = (MESHES / "tank-wall.toml").read_text("utf-8")
    name = text.split("[[case]]")[1].split('name = "')[1].split('"')[0]
    checked = check(panel(tmp_path, "tank-wall", more=TANK % {"case": name}))
    deflection = row(checked, "peak deflection")
    assert deflection.case == "full"
    assert abs(deflection.value.value) == pytest.approx(1.3832e-3, rel=2e-3)
    assert deflection.judgement.used == pytest.approx(1.3832 / 1.8, rel=5e-3)
    stress = row(checked, "peak largest principal")
    assert stress.case == "full, factored"
    assert stress.value.value == pytest.approx(1.2 * 51.6e6, rel=0.01)
    assert checked.verdict.outcome is Outcome.PASSES
    full = checked.judged.solution.reactions(case="full, factored")
    assert abs(full.total.force) == pytest.approx(1.2 * 4767.7, rel=1e-4)
    # Of all that is judged, the factored water too.
    assert checked.validity.largest_deflection == pytest.approx(1.2 * 0.2305, rel=5e-3)


PANE = """
[[combination]]
name = "gust"
purpose = "service"
factors = { wind = 1.0 }

[[combination]]
name = "gust, as stated"
purpose = "strength"
factors = { wind = 1.0 }

[[combination]]
name = "suction"
purpose = "uplift"
factors = { wind = 1.0 }

[[ask]]
name = "middle"
from = [0, 500]
to = [1500, 500]
stations = 31
values = ["deflection", "m_xx"]
"""


def test_the_pane_of_6_mm_passes_in_wind_from_both_sides(tmp_path):
    """Navier: w 5.81 mm, 13.20 MPa, corner pull 94.4 N; corners need both senses."""
    path = panel(
        tmp_path,
        "pane",
        ('name = "wind"\n', 'name = "wind"\nreverses = "yes"\n'),
        (
            'deflection = { span = "1000 mm", at_most = "span/65" }',
            'deflection = { span = "side left", preset = "glass EN 16612" }\n'
            'hold_down = { corners = "100 N" }\nbearing = { corners = "100 N" }\n'
            'stress_range = { of = "stress xx", at_most = "30 MPa" }',
        ),
        more=PANE,
    )
    checked = check(path, out=tmp_path / "out")
    assert [own.name for own in checked.judged.combinations] == [
        *("gust", "gust, wind reversed"),
        *("gust, as stated", "gust, as stated, wind reversed"),
        *("suction", "suction, wind reversed"),
    ]
    deflection = row(checked, "peak deflection")
    assert abs(deflection.value.value) == pytest.approx(5.81e-3, rel=2e-3)
    assert deflection.judgement.limit == pytest.approx(1 / 65)
    assert "EN 16612, read second-hand: check" in checked.text
    stress = row(checked, "peak largest principal")
    assert stress.value.value == pytest.approx(13.20e6, rel=2e-3)
    for quantity in ("corner hold-down", "corner bearing"):
        assert row(checked, quantity).value.value == pytest.approx(94.4, rel=5e-3)
    # The stress swings from one sign to the other.
    found = row(checked, "range of stress xx")
    one = checked.judged.solution.peak("m_xx", case="gust")
    assert found.value.value == pytest.approx(
        2.0 * 6.0 / 0.006**2 * abs(one.value), rel=1e-3
    )
    assert checked.status == 0
    assert "conservative" in checked.text
    written = {path.name for path in checked.files}
    assert {"pane-asked.csv", "pane-line-1.png"} <= written
    with (tmp_path / "out" / "pane-asked.csv").open(newline="") as file:
        table = list(csv.DictReader(file))
    assert len(table) == 6 * 2 * 31
    middle = [
        float(own["value"])
        for own in table
        if own["quantity"] == "deflection"
        and own["case"] == "gust"
        and own["x [m]"] == "0.75"
    ]
    assert middle == [pytest.approx(-5.81e-3, rel=2e-3)]
