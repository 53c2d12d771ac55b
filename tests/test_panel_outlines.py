"""The plan that a panel file states: arcs, shapes, corners, parts, zones, drawings."""

import math
from functools import partial

import numpy as np
import pytest
from panel_texts import MESHES, RICH, changed, read_text

from kplate.errors import InputError
from kplate.materials import STEEL
from kplate.panel import read_panel
from kplate.shapes import Circle, Ellipse, Rectangle, Slot
from kplate.supports import CLAMPED, FREE, GUIDED, SIMPLY_SUPPORTED

POINTS = "points = [[0, 0], [800, 0], [800, 600], [0, 600]]"
SIDES = 'sides = ["south", "east", "north", "west"]'


@pytest.fixture
def read(tmp_path):
    return partial(read_text, tmp_path)


def with_outline(*lines: str) -> str:
    """Add lines to the outline of the lid, 800 x 600 mm."""
    return changed(SIDES, "\n".join([SIDES, *lines]))


def with_section(text: str) -> str:
    return changed("[supports]", f"{text}\n[supports]")


def with_rim(text: str) -> str:
    """Put another rim in the place of points and sides."""
    return changed(f"{POINTS}\n{SIDES}", text).replace('south = "clamped"', "")


# Arcs


def test_an_arc_runs_from_its_point_through_a_place_to_the_next(read):
    arc = "{ from = [800, 0], through = [1100, 300] }"
    outline = read(changed("[800, 0]", arc)).plate.outline
    # A half circle of 300 mm on the east side.
    area = 0.8 * 0.6 + 0.5 * math.pi * 0.3**2
    assert outline.area == pytest.approx(area, rel=1e-12)
    assert outline.side_length("east") == pytest.approx(0.3 * math.pi, rel=1e-12)


def test_an_arc_may_turn_into_the_plate_and_run_back_to_the_first_point(read):
    arc = "{ from = [0, 600], through = [100, 300] }"
    outline = read(changed("[0, 600]", arc)).plate.outline
    half = math.asin(0.6)  # of an arc of radius 500 mm, 100 mm high over 600 mm
    area = 0.8 * 0.6 - 0.5**2 * (half - math.sin(half) * math.cos(half))
    assert outline.area == pytest.approx(area, rel=1e-12)
    assert outline.side_length("west") == pytest.approx(2 * half * 0.5, rel=1e-12)


def test_two_arcs_make_a_rim(read):
    text = with_rim(
        "points = [{ from = [300, 0], through = [0, 300] }, "
        "{ from = [-300, 0], through = [0, -300] }]"
    )
    outline = read(text).plate.outline
    assert outline.area == pytest.approx(math.pi * 0.3**2, rel=1e-12)


@pytest.mark.parametrize(
    ("through", "why"),
    [
        ("[800, 300]", "lies on the straight line"),
        ("[800, 0]", "lies on the straight line"),
        ("[800, 600]", "lies on the straight line"),
    ],
)
def test_no_arc_runs_through_the_straight_line_or_its_ends(read, through, why):
    arc = f"{{ from = [800, 0], through = {through} }}"
    with pytest.raises(InputError, match=r"^\[outline\] points, item 2 = a table: "):
        read(changed("[800, 0]", arc))
    with pytest.raises(InputError, match=why):
        read(changed("[800, 0]", arc))


def test_a_seam_has_arcs_but_none_from_its_end(read):
    seam = (
        '[[seam]]\nname = "rib"\n'
        "points = [{{ from = [100, 300], through = [300, 500] }}, {}]"
    )
    (rib,) = read(with_section(seam.format("[500, 300]"))).plate.outline.seams
    assert rib.name == "rib"
    np.testing.assert_allclose(rib.points, [(0.1, 0.3), (0.5, 0.3)])
    # Run from west to east, the half circle over the north turns to the right.
    np.testing.assert_allclose(rib.bulges, [-1.0], rtol=1e-12)
    end = "{ from = [500, 300], through = [600, 300] }"
    with pytest.raises(InputError) as caught:
        read(with_section(seam.format(end)))
    assert str(caught.value) == (
        "[[seam]] 1 'rib': points, item 2 = a table: no arc can run from the "
        "last point."
    )


# Shapes


@pytest.mark.parametrize(
    ("stated", "shape"),
    [
        (
            "circle = { centre = [400, 300], diameter = 100, name = 'rim' }",
            Circle(centre=(0.4, 0.3), radius=0.05, name="rim"),
        ),
        (
            "slot = { centre = [400, 300], length = 120, width = '4 cm', "
            "angle = '90 deg' }",
            Slot(
                centre=(0.4, 0.3),
                length=0.12,
                width=0.04,
                name="rim",
                angle=math.pi / 2,
            ),
        ),
        (
            "rectangle = { centre = [400, 300], size = [120, '8 cm'], "
            "corner_radius = 10, angle = '30 deg' }",
            Rectangle(
                centre=(0.4, 0.3),
                size=(0.12, 0.08),
                name="rim",
                corner_radius=0.01,
                angle=math.pi / 6,
            ),
        ),
        (
            "ellipse = { centre = ['0.4 m', 300], size = [120, 80] }",
            Ellipse(centre=(0.4, 0.3), size=(0.12, 0.08), name="rim"),
        ),
    ],
)
@pytest.mark.parametrize("where", ["rim", "hole", "zone"])
def test_shapes_of_rims_holes_and_zones(read, stated, shape, where):
    if where == "rim":
        found = read(with_rim(stated)).plate.outline.rim
    else:
        own = stated.replace(", name = 'rim'", "")
        text = with_section(f'[[{where}]]\nname = "rim"\n{own}')
        outline = read(text).plate.outline
        if where == "zone":  # it may have been fitted to its neighbours
            line = outline.zones[0].shape.line
            assert line.box == pytest.approx(shape.line.box, rel=1e-12)
            assert line.area == pytest.approx(shape.area, rel=1e-12)
            return
        (found,) = outline.holes
    assert type(found) is type(shape)
    for key, value in vars(shape).items():
        expected = value if key == "name" else pytest.approx(value, rel=1e-12)
        assert getattr(found, key) == expected, key


def test_a_rim_names_its_side_itself(read):
    rim = "ellipse = { centre = [0, 0], size = [120, 80], name = 'kerb' }"
    assert read(with_rim(rim)).plate.outline.side_names == ("kerb",)


def twenty_four_gon(chords: str) -> str:
    """A supported rim of 24 chords of one side, radius 300 mm."""
    angles = 2.0 * np.pi * np.arange(24) / 24
    points = [[300 * math.cos(a), 300 * math.sin(a)] for a in angles]
    text = with_rim(f"points = {points}\nsides = {['kerb'] * 24}\n{chords}")
    return text.replace("[supports]", '[supports]\nkerb = "simply supported"')


def test_chords_are_an_arc_or_a_polygon_as_the_file_says(read):
    arc = read(twenty_four_gon('chords = "arc"'))
    assert arc.plate.outline.area == pytest.approx(math.pi * 0.3**2, rel=1e-9)
    assert arc.notes == arc.plate.outline.notes
    assert "24 chords of 'kerb'" in arc.notes[0]
    polygon = read(twenty_four_gon('chords = "polygon"'))
    area = 0.5 * 24 * 0.3**2 * math.sin(math.radians(15))
    assert polygon.plate.outline.area == pytest.approx(area, rel=1e-9)
    with pytest.raises(InputError, match=r"^\[supports\]: side 'kerb' is simply supp"):
        read(twenty_four_gon(""))


def test_vertices_within_snap_are_merged(read):
    bent = changed("[800, 0]", "[400, -0.4], [800, 0]").replace(
        'sides = ["south",', 'sides = ["south", "south",'
    )
    assert len(read(bent).plate.outline.rim.points) == 5
    panel = read(bent.replace("sides =", "snap = 0.5\nsides ="))
    assert len(panel.plate.outline.rim.points) == 4
    assert panel.notes[0].startswith("merged into the straight line: (0.4, -0.0004) m")


# Corners and parts


def test_fillets_take_a_corner_off_and_reliefs_cut_it(read):
    text = with_outline(
        "fillets = [",
        '    { corner = ["south", "east"], radius = 60 },',
        '    { corner = ["north", "east"], radius = "3 cm", name = "round" },',
        "]",
        'reliefs = [{ corner = ["north", "west"], radius = 50, name = "cut" }]',
    )
    outline = read(text).plate.outline
    fillets = (1.0 - math.pi / 4.0) * (0.06**2 + 0.03**2)
    relief = math.pi / 4.0 * 0.05**2
    assert outline.area == pytest.approx(0.48 - fillets - relief, rel=1e-12)
    named = {"fillet of south and east", "round", "cut"}
    assert named < set(outline.side_names)
    assert outline.side_length("round") == pytest.approx(0.5 * math.pi * 0.03)


def test_notes_outlive_what_is_done_to_corners(read):
    text = twenty_four_gon('chords = "arc"').replace(
        'chords = "arc"',
        'chords = "arc"\n'
        'parts = [{ side = "kerb", name = "hinge", from = "0 %", to = "25 %" }]',
    )
    assert "24 chords of 'kerb'" in read(text).notes[0]


@pytest.mark.parametrize(
    "ends",
    [
        'from = "10 %", to = "35 %"',
        "from = [720, 600], to = [520, 600]",
        'from = ["520 mm", 601], to = ["72 cm", 599]',
    ],
)
def test_a_part_of_a_side_by_shares_or_places(read, ends):
    """North runs from the east to the west: 10 % of it is at x = 720 mm."""
    text = with_outline(f'parts = [{{ side = "north", name = "hinge", {ends} }}]')
    text = text.replace("[supports]", '[supports]\nhinge = "simply supported"')
    plate = read(text).plate
    assert plate.outline.side_length("hinge") == pytest.approx(0.2, rel=1e-9)
    (piece,) = (i for i, side in enumerate(plate.outline.rim.sides) if side == "hinge")
    assert plate.outline.rim.points[piece] == pytest.approx((0.72, 0.6), rel=1e-9)
    assert plate.support("hinge") is SIMPLY_SUPPORTED
    assert plate.support("north") is FREE


# Inside


def test_zones_seams_and_marks_with_their_supports(read):
    plate = read(RICH).plate
    assert plate.outline.zone_names == ("doubler", "pane")
    around, doubler, pane = plate.sections
    assert around == (pytest.approx(0.008), STEEL)
    assert doubler == (pytest.approx(0.012), STEEL)
    assert pane[0] == pytest.approx(0.008)
    assert (pane[1].name, pane[1].nu) == ("own", 0.23)
    # 300 x 200 mm and a segment 120 mm high over its chord of 300 mm.
    radius = (0.15**2 + 0.12**2) / (2 * 0.12)
    half = math.asin(0.15 / radius)
    segment = radius**2 * (half - math.sin(half) * math.cos(half))
    assert plate.outline.zone_area("doubler") == pytest.approx(0.06 + segment, rel=1e-5)
    marks = {mark.name: mark.at for mark in plate.outline.marks}
    assert marks["pin"] == pytest.approx((0.6, 0.7), rel=1e-12)
    held = {"hollow": GUIDED, "rib": CLAMPED, "track": FREE, "pin": SIMPLY_SUPPORTED}
    assert {name: plate.support(name) for name in held} == held


def test_the_mass_counts_zones_with_their_own_thickness_and_density(read):
    zone = '[[zone]]\nname = "pad"\ncircle = { centre = [400, 300], radius = 100 }\n'
    own = 'material = { name = "own", E = "70 GPa", nu = 0.2, density = "2500 kg/m^3" }'
    mass = read(with_section(f'{zone}thickness = "20 mm"\n{own}')).plate.mass
    pad = math.pi * 0.1**2
    expected = 7850 * 0.01 * (0.48 - pad) + 2500 * 0.02 * pad
    assert mass == pytest.approx(expected, rel=1e-5)


# What is expected


HOLED = with_section("[[hole]]\ncircle = { centre = [400, 300], radius = 50 }")


@pytest.mark.parametrize(
    "stated",
    [
        'size = "800 mm x 600 mm"',
        'size = "0.8 m x 60 cm", holes = 1',
        'size = "800.4 mm x 599.7 mm"',
        'area = "0.472 m^2"',
        'area = "4.7e5 mm2"',
    ],
)
def test_a_panel_as_expected_is_read(read, stated):
    read(HOLED.replace("sides =", f"expect = {{ {stated} }}\nsides ="))


@pytest.mark.parametrize(
    ("stated", "message"),
    [
        ('size = "600 mm x 800 mm"', "the panel is 800 x 600 mm."),
        ('size = "800 mm x 602 mm"', "the panel is 800 x 600 mm."),
        ('size = "800 mm"', 'it must be two lengths, "800 mm x 600 mm".'),
        ("holes = 2", "the panel has 1."),
        ("holes = true", "it must be a whole number, without quotes."),
        ('area = "0.48 m^2"', "the panel has 0.472146 m^2."),
    ],
)
def test_a_panel_that_is_not_as_expected_is_refused(read, stated, message):
    with pytest.raises(InputError) as caught:
        read(HOLED.replace("sides =", f"expect = {{ {stated} }}\nsides ="))
    assert str(caught.value).startswith("[outline] expect: ")
    assert str(caught.value).endswith(f": {message}")


# Mistakes


MISTAKES = [
    (
        changed(f"{POINTS}\n{SIDES}", ""),
        "[outline]: its shape is missing; add points = [[0, 0], [800, 0], [800, 600], "
        "[0, 600]], or one of circle, slot, rectangle, ellipse.",
    ),
    (
        with_section("[[hole]]\nslot = { centre = [9, 9], length = 20, width = 30 }"),
        "[[hole]] 1 slot: slot 'hole-1' is 0.02 m long and 0.03 m wide; its length, "
        "from end to end, must be more than its width.",
    ),
    (
        with_section("[[hole]]\nellipse = { centre = [9, 9], size = [20, 0] }"),
        "[[hole]] 1 ellipse: size = [20, 0]: both lengths must be positive.",
    ),
    (
        with_section("[[hole]]\nslot = { centre = [9, 9] }\nchords = 'arc'"),
        "[[hole]] 1: slot and chords exclude each other; keep one.",
    ),
    (
        with_section("[[hole]]\npoints = [[1, 1], [2, 2]]"),
        "[[hole]] 1: points = a list of 2: it takes at least three points [x, y], two "
        "where an arc runs from one.",
    ),
    (
        changed("[800, 0]", "{ from = [800, 0] }"),
        "[outline] points, item 2: through is missing; add through = [950, 300].",
    ),
    (
        changed("[800, 0]", "{ to = [800, 0], through = [900, 300] }"),
        "[outline] points, item 2: unknown field 'to'; the fields are from, through.",
    ),
    (
        changed("[800, 0]", '["800", 0]'),
        "[outline] points, item 2 = ['800', 0]: a length needs a unit, such as "
        '"10 mm".',
    ),
    (
        with_outline('chords = "round"'),
        "[outline] chords = 'round': it must be one of arc, polygon.",
    ),
    (
        with_outline('fillets = [{ corner = ["south"], radius = 20 }]'),
        "[outline] fillets, item 1: corner = ['south']: it takes the names of the two "
        "sides.",
    ),
    (
        with_outline('fillets = [{ corner = ["south", "eas"], radius = 20 }]'),
        "[outline] fillets, item 1: corner, item 2 = 'eas': there is no such side; the "
        "sides are 'south', 'east', 'north', 'west'. Did you mean 'east'?",
    ),
    (
        with_outline('fillets = [{ corner = ["south", "north"], radius = 20 }]'),
        "[outline] fillets, item 1: sides 'south' and 'north' do not meet at a corner; "
        "the corners are west/south, south/east, east/north, north/west.",
    ),
    (
        with_outline('reliefs = [{ corner = ["south", "east"], radius = 0 }]'),
        "[outline] reliefs, item 1: radius = 0: it must be a positive length.",
    ),
    (
        with_outline(
            'parts = [{ side = "north", name = "a", from = "60 %", to = "40 %" }]'
        ),
        "[outline] parts, item 1: the part 'a' of side 'north' runs from 0.6 to 0.4 of "
        "its length; it must run from a smaller to a larger share, 0 to 1.",
    ),
    (
        with_outline(
            'parts = [{ side = "north", name = "a", from = "0 %", to = [0, 0]}]'
        ),
        "[outline] parts, item 1: to = [0, 0]: from and to are two shares or two "
        "places.",
    ),
    (
        with_outline('parts = [{ side = "north", name = "a", from = 0, to = 0.5 }]'),
        "[outline] parts, item 1: from = 0: it must be a share from 0 % to 100 %, such "
        'as "40 %".',
    ),
    (
        with_section("[[zone]]\ncircle = { centre = [400, 300], radius = 50 }"),
        '[[zone]] 1: name is missing; add name = "pad".',
    ),
    (
        with_section(
            '[[zone]]\nname = "pad"\ncircle = { centre = [0, 300], radius = 50 }'
        ),
        "[[zone]]: zone 'pad' lies outside the outline near ",
    ),
    (
        with_section(
            '[[zone]]\nname = "pad"\ncircle = { centre = [400, 300], radius = 50 }\n'
            'material = "steal"'
        ),
        "[[zone]] 1 'pad': material = 'steal': it must be one of steel S235, ",
    ),
    (
        with_section(
            '[[zone]]\nname = "pad"\ncircle = { centre = [400, 300], radius = 50 }\n'
            'thickness = "0 mm"'
        ),
        "[[zone]] 1 'pad': thickness = '0 mm': it must be a positive length.",
    ),
    (
        with_section('[[seam]]\nname = "rib"\npoints = [[0, 300]]'),
        "[[seam]] 1 'rib': seam 'rib' has points of shape (1, 2); it takes at least "
        "two pairs (x, y).",
    ),
    (
        with_section('[[seam]]\nname = "rib"\npoints = [[0, 300], [900, 300]]'),
        "[[seam]]: seam 'rib' leaves the plate near ",
    ),
    (
        with_section('[[mark]]\nname = "bolt"\nat = [900, 300]'),
        "[[mark]]: mark 'bolt' at (0.9, 0.3) m is not on the plate; it lies outside "
        "the outline or in a hole.",
    ),
    (
        with_section('[[mark]]\nname = "south"\nat = [400, 300]'),
        "[[mark]]: mark 'south' has the name of something else; sides, zones, seams "
        "and marks need names of their own.",
    ),
]


@pytest.mark.parametrize(("text", "message"), MISTAKES, ids=range(len(MISTAKES)))
def test_a_mistake_is_named(read, text, message):
    with pytest.raises(InputError) as caught:
        read(text)
    found = str(caught.value)
    assert len(found.splitlines()) == 1
    # Of messages that end in places or long lists, the beginning.
    assert found[: len(message)] == message
    assert len(found) == len(message) or message.endswith(" ")


# The panels that come with the package


def test_the_flange_cover():
    panel = read_panel(MESHES / "flange-cover.toml")
    plate = panel.plate
    slots = 2 * (0.12 * 0.04 + math.pi * 0.02**2)
    area = 1.4 * 0.8 - (4.0 - math.pi) * 0.1**2 - slots
    assert plate.outline.area == pytest.approx(area, rel=1e-12)
    assert plate.thicknesses == pytest.approx([0.008, 0.012])
    assert plate.support("sill") is plate.support("bolt") is SIMPLY_SUPPORTED
    assert set(map(plate.support, plate.outline.side_names)) == {SIMPLY_SUPPORTED, FREE}
    assert panel.cases[1].loads[1].zone == "pad"
