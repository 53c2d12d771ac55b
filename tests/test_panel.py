"""Panel files: what they state arrives in SI units, whatever units they use."""

import hashlib
import math
import re
from functools import partial
from itertools import pairwise

import numpy as np
import pytest
from panel_texts import BASE, MESHES, STARTER, changed, read_text, with_load

from kplate.errors import KplateWarning
from kplate.goals import Deflection
from kplate.judging import allowed
from kplate.limits import StressLimit
from kplate.loads import (
    DiscPatch,
    Hydrostatic,
    PointForce,
    Pressure,
    RectanglePatch,
    SelfWeight,
)
from kplate.materials import GLASS, STEEL
from kplate.panel import Panel, read_panel
from kplate.polygon import Polygon
from kplate.presets import DEFLECTIONS, FACTORS, MEMORY, STEPS, STRENGTHS
from kplate.shapes import Circle
from kplate.supports import CLAMPED, FREE, SIMPLY_SUPPORTED


@pytest.fixture
def read(tmp_path):
    return partial(read_text, tmp_path)


def only_load(panel: Panel):
    ((load,),) = [case.loads for case in panel.cases]
    return load


# What is stated arrives in SI units


def test_a_panel_arrives_in_si_units(read):
    panel = read(BASE)
    assert (panel.name, panel.revision, panel.author) == ("lid", "", "")
    assert panel.plate.thickness == pytest.approx(0.010, rel=1e-12)
    assert panel.plate.material is STEEL
    np.testing.assert_allclose(
        panel.plate.outline.rim.points,
        [(0, 0), (0.8, 0), (0.8, 0.6), (0, 0.6)],
        rtol=1e-12,
    )
    assert panel.plate.outline.side_names == ("south", "east", "north", "west")
    assert panel.plate.support("south") is CLAMPED
    assert panel.plate.support("east") is FREE
    patch = only_load(panel)
    assert isinstance(patch, RectanglePatch)
    assert patch.force == pytest.approx(-1500.0, rel=1e-12)
    assert patch.centre == pytest.approx((0.4, 0.3), rel=1e-12)
    assert patch.size == pytest.approx((0.2, 0.1), rel=1e-12)
    assert patch.angle == 0.0
    assert panel.limits == (
        StressLimit(criterion="von Mises", strength=235e6, factor=1.5),
    )
    assert panel.combinations == ()
    assert panel.tolerance is panel.held_in_plane is panel.triangles is None
    assert panel.stock == ()


def test_the_head_of_a_panel(read):
    head = (
        'thickness = "10 mm"\nrevision = "B"\nauthor = "M. Alder"\n'
        'tolerance = "0.5 %"\n"held in plane" = "yes"\ntriangles = 20000'
    )
    panel = read(changed('thickness = "10 mm"', head))
    assert (panel.revision, panel.author) == ("B", "M. Alder")
    assert panel.tolerance == pytest.approx(0.005, rel=1e-12)
    assert panel.held_in_plane is True
    assert panel.triangles == 20000


def test_a_material_of_ones_own(read):
    own = (
        '{ name = "board", E = "11 GPa", nu = 0.3, density = "590 kg/m^3", '
        'source = "data sheet" }'
    )
    material = read(changed('"steel S235"', own)).plate.material
    assert (material.name, material.source) == ("board", "data sheet")
    assert pytest.approx(11e9, rel=1e-12) == material.E
    assert material.nu == 0.3
    assert material.density == pytest.approx(590.0, rel=1e-12)


def test_an_unusual_material_is_read_with_a_warning(read):
    own = '{ name = "board", E = "11 MPa", nu = 0.3 }'
    with pytest.warns(KplateWarning, match="outside 0.1 to 1000 GPa"):
        assert read(changed('"steel S235"', own)).plate.material.E == 11e6


def test_a_round_outline_and_holes(read):
    text = re.sub(
        r"points = .*\nsides = .*",
        'circle = { centre = [100, 0], radius = 300, name = "kerb" }\n'
        '[[hole]]\nname = "shaft"\ncircle = { centre = [100, 50], diameter = 80 }\n'
        "[[hole]]\npoints = [[0, -90], [60, -90], [0, -50]]\n"
        "[[hole]]\npoints = [[200, -90], [260, -90], [200, -50]]\n"
        'sides = ["a", "b", "a"]',
        BASE.replace("south =", "kerb ="),
    )
    plate = read(text).plate
    assert plate.outline.rim == Circle(centre=(0.1, 0.0), radius=0.3, name="kerb")
    shaft, second, third = plate.outline.holes
    assert shaft.name == "shaft"
    assert shaft.centre == pytest.approx((0.1, 0.05), rel=1e-12)
    assert shaft.radius == pytest.approx(0.04, rel=1e-12)
    assert isinstance(second, Polygon)
    assert second.sides == ("hole-2",) * 3
    assert second.area == pytest.approx(0.5 * 0.06 * 0.04, rel=1e-12)
    assert third.sides == ("a", "b", "a")
    assert plate.support("kerb") is CLAMPED


def test_sides_without_names_are_numbered(read):
    text = re.sub(r"sides = .*\n", "", BASE.replace("south =", "side-1 ="))
    names = read(text).plate.outline.side_names
    assert names == ("side-1", "side-2", "side-3", "side-4")


@pytest.mark.parametrize(
    ("stated", "load"),
    [
        ('{ pressure = "5 kPa down" }', Pressure(-5000.0)),
        ('{ pressure = "5 kN/m^2 up" }', Pressure(5000.0)),
        (
            '{ force = "1 kN up", at = ["0 m", "-5 cm"] }',
            PointForce(force=1e3, at=(0, -0.05)),
        ),
        (
            '{ force = "1 kN down", over = "disc 150 mm", at = ["0.4 m", "30 cm"] }',
            DiscPatch(force=-1e3, centre=(0.4, 0.3), radius=0.075),
        ),
        (
            '{ force = "1 kN down", over = "2 cm x 3 cm", at = ["4 m", "3 m"], '
            'angle = "30 deg" }',
            RectanglePatch(
                force=-1e3, centre=(4, 3), size=(0.02, 0.03), angle=math.pi / 6
            ),
        ),
        # 9.80665 m/s2 is standard gravity, ISO 80000-3 (from memory)
        ('{ self_weight = "down" }', SelfWeight(acceleration=-9.80665)),
        (
            '{ self_weight = "up", gravity = "9.81 m/s^2" }',
            SelfWeight(acceleration=9.81),
        ),
        (
            '{ liquid = "1000 kg/m^3", level = "900 mm", pushes = "up" }',
            Hydrostatic(level=0.9, specific_weight=9806.65),
        ),
        (
            '{ liquid = "1.2 t/m^3", level = "-0.1 m", pushes = "down", '
            'gravity = "10 m/s^2" }',
            Hydrostatic(level=-0.1, specific_weight=-12000.0),
        ),
    ],
)
def test_loads_are_positive_up(read, stated, load):
    found = only_load(read(with_load(stated)))
    assert type(found) is type(load)
    for name, value in vars(load).items():
        given = getattr(found, name)
        same = value if value is None else pytest.approx(value, rel=1e-12)
        assert given == same, name


@pytest.mark.parametrize(
    ("stated", "at_most", "words"),
    [
        ('{ span = "600 mm", at_most = "span/200" }', 0.003, "span/200"),
        ('{ at_most = "4 mm" }', 0.004, "4 mm"),
        (
            '{ span = "1.2 m", at_most = ["span/200", "4 mm"] }',
            0.004,
            "span/200 and 4 mm",
        ),
        (
            '{ span = "60 cm", at_most = ["4 mm", "span / 200"] }',
            0.003,
            "4 mm and span / 200",
        ),
    ],
)
def test_the_least_of_the_deflection_limits_counts(read, stated, at_most, words):
    text = changed("[limits]", f"[limits]\ndeflection = {stated}")
    limit = read(text).limits[0]
    assert limit.at_most == pytest.approx(at_most, rel=1e-12)
    assert limit.words == words


def test_hold_down_and_stock(read):
    lines = '[limits]\nhold_down = "0.2 kN"\nstock = ["3 mm", "1/4 in", "1 cm"]'
    text = changed("[limits]", lines)
    (corners,) = read(text).limits[1:]
    assert (corners.at, corners.sense) == ("corners", "hold-down")
    bolt = '[[mark]]\nname = "bolt"\nat = [400, 300]\n\n[supports]\n'
    bolt += 'bolt = "simply supported"'
    panel = read(text.replace("[supports]", bolt))
    corners, points = panel.limits[1:]
    assert (corners.at, corners.sense) == ("corners", "hold-down")
    assert (points.at, points.sense) == ("points", "hold-down")
    assert corners.at_most == points.at_most == pytest.approx(200.0, rel=1e-12)
    assert panel.stock == pytest.approx((0.003, 0.00635, 0.010), rel=1e-12)


def test_the_digest_is_that_of_the_bytes(read):
    panel = read(BASE)
    assert panel.digest == hashlib.sha256(panel.path.read_bytes()).hexdigest()[:8]
    assert read(BASE + "\n").digest != panel.digest


def test_a_byte_order_mark_and_windows_line_ends_do_no_harm(tmp_path):
    path = tmp_path / "panel.toml"
    path.write_bytes(b"\xef\xbb\xbf" + BASE.replace("\n", "\r\n").encode())
    assert read_panel(path).name == "lid"


# The numbers do not depend on the units they are stated in


METRIC = """
[panel]
name = "lid"
thickness = "12.7 mm"
material = { name = "own", E = "200 GPa", nu = 0.3, density = "8000 kg/m^3" }
[outline]
unit = "mm"
points = [[0, 0], [2438.4, 0], [2438.4, 1219.2], [0, 1219.2]]
[[hole]]
circle = { centre = [609.6, 609.6], radius = 152.4 }
[supports]
side-1 = "clamped"
[[case]]
name = "all"
loads = [
    { pressure = "5 kPa down" },
    { force = "1 kN down", over = "254 mm x 508 mm", at = ["1219.2 mm", "609.6 mm"] },
    { liquid = "1000 kg/m^3", level = "914.4 mm", pushes = "up", gravity = "9.81 m/s^2" },
]
[limits]
deflection = { span = "1219.2 mm", at_most = "span/240" }
stress = { criterion = "von Mises", strength = "250 MPa", factor = 1.5 }
hold_down = "2 kN"
stock = ["12.7 mm", "25.4 mm"]
"""  # noqa: E501  TOML keeps an inline table on one line
PSI = 0.45359237 * 9.80665 / 0.0254**2
LBF = 0.45359237 * 9.80665
PCF = 0.45359237 / 0.3048**3
AMERICAN = f"""
[panel]
name = "lid"
thickness = "1/2 in"
material = {{ name = "own", E = "{200e9 / PSI!r} psi", nu = 0.3, density = "{8000 / PCF!r} lb/ft^3" }}
[outline]
unit = "ft"
points = [[0, 0], [8, 0], [8, 4], [0, 4]]
[[hole]]
circle = {{ centre = [2, 2], diameter = 1 }}
[supports]
side-1 = "clamped"
[[case]]
name = "all"
loads = [
    {{ pressure = "{5e3 / PSI!r} psi down" }},
    {{ force = "{1e3 / LBF!r} lbf down", over = "10 in x 20 in", at = ["4 ft", "24 in"] }},
    {{ liquid = "{1e3 / PCF!r} pcf", level = "1 yd", pushes = "up", gravity = "{9.81 / 0.3048!r} ft/s^2" }},
]
[limits]
deflection = {{ span = "4 ft", at_most = "span/240" }}
stress = {{ criterion = "von Mises", strength = "{250e3 / PSI!r} ksi", factor = 1.5 }}
hold_down = "{2 / LBF!r} kip"
stock = ["1/2 in", "1 in"]
"""  # noqa: E501


def numbers(panel: Panel) -> list[float]:
    """Every number that a panel holds."""
    plate, limits = panel.plate, panel.limits
    found = [plate.thickness, plate.material.E, plate.material.density, plate.mass]
    found += [*plate.outline.rim.points.ravel(), *plate.outline.holes[0].centre]
    found += [plate.outline.holes[0].radius, *panel.stock]
    found += [allowed(plate, limit) for limit in limits]
    for load in panel.cases[0].loads:
        stated = [value for value in vars(load).values() if value is not None]
        found += np.hstack([np.ravel(value) for value in stated]).tolist()
    return found


def test_the_same_panel_in_other_units_has_the_same_numbers(read):
    metric, american = read(METRIC), read(AMERICAN)
    assert numbers(american) == pytest.approx(numbers(metric), rel=1e-12)


def test_a_panel_is_shown_in_the_units_of_its_file(read):
    units = read(METRIC).units
    assert (units.length.symbol, units.stress.symbol) == ("mm", "MPa")
    assert units.force.show(1500.0) == "1500 N"
    units = read(AMERICAN).units
    assert units.length.show(1.2192) == "4.000 ft"
    assert units.deflection.show(0.00254) == "0.1000 in"
    assert units.force.show(LBF) == "1.000 lbf"
    assert units.line_force.show(LBF / 0.0254) == "1.000 lbf/in"
    assert units.pressure.show(PSI) == "1.000 psi"
    assert units.stress.show(250e6) == "36.26 ksi"
    assert read(METRIC.replace("250 MPa", "250 N/mm²")).units.stress.symbol == "N/mm²"


# The files that come with the package


def test_the_starter_states_every_section_and_explains_each_line():
    lines = STARTER.read_text(encoding="utf-8").splitlines()
    for above, line in pairwise(lines):
        assert not line or "#" in line or above.lstrip().startswith("#"), line
        assert len(line) < 110
    panel = read_panel(STARTER)
    assert panel.plate.support("weir") is CLAMPED
    assert panel.plate.support("bank") is SIMPLY_SUPPORTED
    assert panel.plate.outline.area == pytest.approx(
        1.2 * 0.9 - 0.4 * 0.3 - math.pi * 0.06**2 - 0.15**2, rel=1e-12
    )
    assert len(panel.cases) == 2
    assert panel.stock


# The numbers below are those of the statements in the file's own comments; the check
# values of their results are in the tests of `check`.
@pytest.mark.parametrize(
    ("name", "size", "material", "support", "at_most", "stress", "stock"),
    [
        (
            "pit-cover",
            (0.8, 0.6),
            STEEL,
            SIMPLY_SUPPORTED,
            0.003,
            235e6,
            (3, 4, 5, 6, 8, 10),
        ),
        ("tank-wall", (1.2, 0.9), STEEL, CLAMPED, 0.0018, 235e6, (6, 8, 10)),
        ("pane", (1.5, 1.0), GLASS, SIMPLY_SUPPORTED, 1 / 65, 25e6, (6, 8, 10)),
    ],
)
def test_the_rectangles(name, size, material, support, at_most, stress, stock):
    panel = read_panel(MESHES / f"{name}.toml")
    plate = panel.plate
    assert plate.outline.box == pytest.approx((0, 0, *size), rel=1e-12)
    assert plate.thickness == pytest.approx(0.006, rel=1e-12)
    assert plate.material is material
    assert set(map(plate.support, plate.outline.side_names)) == {support}
    deflection, own = (allowed(panel.plate, limit) for limit in panel.limits)
    assert deflection == pytest.approx(at_most, rel=1e-12)
    assert own == pytest.approx(stress / 1.5, rel=1e-12)
    assert panel.stock == pytest.approx(np.array(stock) * 1e-3, rel=1e-12)


def test_the_loads_of_the_rectangles():
    uniform, wheel = read_panel(MESHES / "pit-cover.toml").cases
    assert uniform.loads == (Pressure(-5000.0),)
    (patch,) = wheel.loads
    assert patch.force == -1500.0
    assert (*patch.centre, *patch.size) == pytest.approx((0.4, 0.3, 0.2, 0.2))
    ((water,),) = [case.loads for case in read_panel(MESHES / "tank-wall.toml").cases]
    # 8.829 kPa at the foot
    assert water.specific_weight * water.level == pytest.approx(-8829.0, rel=1e-12)
    assert water.up == (0.0, 1.0)
    ((wind,),) = [case.loads for case in read_panel(MESHES / "pane.toml").cases]
    assert wind == Pressure(-1000.0)


def test_the_landing_cover():
    panel = read_panel(MESHES / "landing-cover.toml")
    plate = panel.plate
    area = 1.6 * 0.8 + 1.0 * 0.4 - math.pi * 0.12**2
    assert plate.outline.area == pytest.approx(area, rel=1e-12)
    assert plate.mass == pytest.approx(7850 * 0.012 * area, rel=1e-12)
    held = set(map(plate.support, plate.outline.side_names))
    assert held == {CLAMPED, SIMPLY_SUPPORTED, FREE}
    crowd, trolley = panel.cases
    assert crowd.loads == (SelfWeight(), Pressure(-5000.0))
    patch = trolley.loads[1]
    assert (patch.force, patch.size) == (-2000.0, pytest.approx((0.2, 0.15)))
    assert patch.angle == pytest.approx(math.pi / 6)


# Limits, combinations and what is asked for


def limits_of(read, text):
    return read(changed(STRESS, text)).limits


STRESS = 'stress = { criterion = "von Mises", strength = "235 MPa", factor = 1.5 }'


@pytest.mark.parametrize(
    ("stated", "at_most", "words", "source"),
    [
        (
            '{ span = "side north", at_most = "span/200" }',
            0.004,
            "span/200 of side north",
            "",
        ),
        (
            '{ cantilever = "side east", at_most = ["span/300", "5 mm"] }',
            0.004,
            "span/300 and 5 mm, span twice the cantilever, side east",
            "",
        ),
        (
            '{ cantilever = "0.3 m", at_most = "span/200" }',
            0.003,
            "span/200, span twice the cantilever, 0.3 m",
            "",
        ),
        (
            '{ preset = "walkway ISO 14122-2", span = "600 mm" }',
            0.003,
            "span/200",
            "ISO 14122-2, read second-hand: check",
        ),
        (
            '{ preset = "flooring BS 4592-0", span = "3 m" }',
            0.010,
            "span/200 and 10 mm",
            "BS 4592-0, from memory: check",
        ),
        (
            '{ preset = "floor IBC, live", span = "3600 mm" }',
            0.010,
            "span/360",
            "IBC, Table 1604.3",
        ),
        (
            '{ preset = "bolted flat cover" }',
            0.0008,
            "0.8 mm",
            "common practice for heat exchangers",
        ),
    ],
)
def test_a_deflection_limit_names_its_span_and_source(
    read, stated, at_most, words, source
):
    (limit,) = limits_of(read, f"deflection = {stated}")
    assert limit.at_most == pytest.approx(at_most, rel=1e-12)
    assert (limit.words, limit.source) == (words, source)


def test_several_limits_of_a_kind_stand_beside_each_other(read):
    limits = limits_of(
        read,
        'deflection = [{ at_most = "3 mm" }, { at_most = "5 mm" }]\n'
        'step = { along = "north", preset = "walkway ISO 14122-2" }\n'
        'stress_range = { of = "Tresca", at_most = "80 MPa" }\n'
        'hold_down = [{ sides = "2 kN/m", only = ["south"] }]\n'
        'bearing = { corners = "1 kN", sides = "3 kN/m" }',
    )
    assert [limit.quantity for limit in limits] == [
        "peak deflection",
        "peak deflection",
        "step along north",
        "range of Tresca",
        "south hold-down",
        "corner bearing",
        "side bearing",
    ]
    numbers = [0.003, 0.005, 0.004, 80e6, 2e3, 1e3, 3e3]
    assert [limit.at_most for limit in limits] == pytest.approx(numbers)
    assert limits[2].source == "ISO 14122-2, read second-hand: check"


def test_a_preset_strength_goes_by_thickness_and_says_where_it_is_from(read):
    """EN 10025-2, S235: 235, 225, 215 MPa to 16, 40, 63 mm (read in a public copy)."""
    text = 'stress = { preset = "steel S235 EN 10025-2", factor = "steel" }'
    (limit,) = limits_of(read, text)
    strengths = [limit.strength_at(h) for h in (0.016, 0.017, 0.063)]
    assert strengths == pytest.approx([235e6, 225e6, 215e6])
    assert limit.factor == 1.0
    assert limit.source == "EN 10025-2; factor of steel from memory: check"
    text = 'stress = { preset = "float glass", factor = "annealed glass" }'
    (limit,) = limits_of(read, text)
    assert limit.criterion == "largest principal"
    assert limit.allowed(0.006) == pytest.approx(45e6 / 1.8)
    assert limit.source.count("from memory: check") == 2


def test_every_preset_from_memory_or_second_hand_says_so():
    """As the notes on sources have it; the others were read in a public copy."""
    marked = {
        name
        for table in (DEFLECTIONS, STEPS, STRENGTHS)
        for name, preset in table.items()
        if preset.source.endswith(": check")
    }
    assert marked == {
        "walkway ISO 14122-2",
        "flooring BS 4592-0",
        "glass EN 16612",
        "stainless 1.4301",
        "aluminium 5083",
        "float glass",
    }
    assert all(source == MEMORY for _, source in FACTORS.values())


def test_combinations_arrive_as_stated(read):
    text = changed(
        "[limits]",
        """[[case]]
name = "wind"
loads = [{ pressure = "1 kPa up" }]
reverses = "yes"

[[case]]
name = "crane"
loads = [{ pressure = "1 kPa down" }]

[[combination]]
preset = "EN 1990 STR"
permanent = ["wheel"]
variable = ["wind"]

[[combination]]
name = "gust"
purpose = "uplift"
factors = { wheel = 0.9, wind = 1.5 }

[limits]""",
    )
    panel = read(text)
    assert [case.reverses for case in panel.cases] == [False, True, False]
    assert [own.name for own in panel.combinations] == [
        *(f"STR {k}" for k in (1, 2, 3, 4)),
        "gust",
    ]
    assert dict(panel.combinations[-1].factors) == {"wheel": 0.9, "wind": 1.5}
    assert panel.notes == ("case crane is in no combination: not judged",)


def test_points_and_lines_asked_for_arrive_in_si_units(read):
    text = (
        BASE.replace(
            "[supports]", '[[mark]]\nname = "bolt"\nat = [400, 300]\n[supports]'
        )
        + """
[[ask]]
name = "bolt"
at = "bolt"
values = ["deflection", "von Mises", "deflection"]

[[ask]]
name = "middle"
from = [0, 300]
to = ["0.8 m", 300]
stations = 5
values = ["m_xx"]
"""
    )
    bolt, middle = read(text).asks
    assert bolt.places == ((0.4, 0.3),)
    assert bolt.values == ("deflection", "von Mises")
    assert bolt.goals == (Deflection(at=(0.4, 0.3)),)
    np.testing.assert_allclose(middle.distance, [0.0, 0.2, 0.4, 0.6, 0.8])
    assert middle.goals == ()
