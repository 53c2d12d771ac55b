"""Which element suits a plate, what it is called, and where it can be asked for."""

from functools import partial

import pytest
from panel_texts import BASE, changed, read_text
from plates import SIDES

from kplate.adapt import solve
from kplate.check import check
from kplate.choice import MOST, TRIANGLES, Choice, choose
from kplate.elements import ELEMENTS
from kplate.errors import InputError
from kplate.loads import Pressure
from kplate.materials import GLASS, STEEL
from kplate.outline import Outline
from kplate.plate import Plate, Section
from kplate.shapes import Circle, Rectangle
from kplate.supports import CLAMPED, FREE, GUIDED, SIMPLY_SUPPORTED

SQUARE = Outline.polygon([(0, 0), (1, 0), (1, 1), (0, 1)], sides=SIDES)
LOAD = [Pressure(-1e3)]
PATCH = Rectangle(centre=(0.5, 0.5), size=(0.4, 0.2), name="edge")
TRACK = [(0.2, 0.5), (0.8, 0.5)]


def plate(outline=SQUARE, *, zones=(), **supports):
    """A steel plate, hinged all round, with other supports and zones as stated."""
    held = dict.fromkeys(outline.side_names, SIMPLY_SUPPORTED) | supports
    return Plate(
        outline=outline,
        thickness=0.01,
        material=STEEL,
        supports=held,
        zones=dict(zones),
    )


ZONED = SQUARE.zone(PATCH, name="pad")
SEAMED = SQUARE.seam(TRACK, name="rib")
HOLED = SQUARE.cut(Circle(centre=(0.5, 0.5), radius=0.2, name="port"))
BULGED = Outline.polygon(
    [(0, 0), (1, 0), (1, 1), (0, 1)], sides=SIDES, bulges=[0.0, 0.2, 0.0, 0.0]
)

# Plates whose moments are smooth along straight sides
SMOOTH = {
    "hinged": plate(),
    "clamped and free": plate(south=CLAMPED, north=FREE, east=GUIDED),
    "a zone of the same section": plate(ZONED),
    "a zone that says what the plate is": plate(
        ZONED, zones={"pad": Section(thickness=0.01, material=STEEL)}
    ),
    "a free seam": plate(SEAMED),
    "a hinged seam": plate(SEAMED, rib=SIMPLY_SUPPORTED),
    "a point support": plate(SQUARE.mark((0.5, 0.5), name="pin"), pin=SIMPLY_SUPPORTED),
    "a hole of straight sides": plate(SQUARE.cut(PATCH)),
    "a disc": plate(Outline.circle((0.0, 0.0), radius=1.0)),
    "a free round side": plate(BULGED, east=FREE),
    "a clamped round hole": plate(HOLED, port=CLAMPED),
}
# Plates with a kink in their moments, and the words for it
KINKED = {
    "a thicker zone": (
        plate(ZONED, zones={"pad": Section(thickness=0.02)}),
        "thickness or material changes at zone pad",
    ),
    "a zone of another material": (
        plate(ZONED, zones={"pad": Section(material=GLASS)}),
        "thickness or material changes at zone pad",
    ),
    "a clamped seam": (plate(SEAMED, rib=CLAMPED), "seam rib holds the slope"),
    "a guided seam": (plate(SEAMED, rib=GUIDED), "seam rib holds the slope"),
    "the second zone of two": (
        plate(
            ZONED.zone(
                Rectangle(centre=(0.5, 0.2), size=(0.4, 0.2), name="edge"), name="bar"
            ),
            zones={"bar": Section(thickness=0.02)},
        ),
        "thickness or material changes at zone bar",
    ),
    "all of them: the step comes first": (
        plate(
            HOLED.seam([(0.1, 0.1), (0.9, 0.1)], name="rib").zone(
                Rectangle(centre=(0.5, 0.85), size=(0.4, 0.1), name="edge"), name="pad"
            ),
            rib=CLAMPED,
            zones={"pad": Section(thickness=0.02)},
        ),
        "thickness or material changes at zone pad",
    ),
}
smooth = pytest.mark.parametrize("name", SMOOTH)
kinked = pytest.mark.parametrize("name", KINKED)


@smooth
def test_smooth_moments_take_the_quintic(name):
    assert choose(SMOOTH[name]) == Choice(element="quintic", reason="")


@kinked
def test_kinks_take_hct_and_say_why(name):
    stated, words = KINKED[name]
    assert choose(stated) == Choice(element="hct", reason=words)


@kinked
def test_the_quintic_is_refused_where_its_moments_would_be_wrong(name):
    stated, words = KINKED[name]
    with pytest.raises(InputError) as caught:
        choose(stated, "quintic")
    assert str(caught.value) == (
        f"the quintic would give wrong moments: {words}; use element 'auto', 'hct' or "
        "'dkt'."
    )


@pytest.mark.parametrize("element", ["hct", "dkt"])
def test_what_is_asked_for_is_taken_without_a_reason(element):
    """On any plate, and for any number of triangles."""
    for stated in (plate(), SMOOTH["a disc"]):
        for triangles in (None, 100, MOST + 1):
            assert choose(stated, element, triangles) == Choice(element=element)


def test_the_quintic_that_is_asked_for_is_taken_for_any_number_of_triangles():
    assert choose(plate(), "quintic", MOST + 1) == Choice(element="quintic")


@pytest.mark.parametrize("stated", [plate(), SMOOTH["a disc"]], ids=["square", "o"])
def test_a_great_many_triangles_take_dkt(stated):
    few = choose(stated, triangles=MOST)
    assert few == choose(stated)
    assert choose(stated, triangles=MOST + 1) == Choice(
        element="dkt", reason="more than 100000 triangles are asked for"
    )


def test_an_element_that_there_is_not_is_refused():
    with pytest.raises(InputError) as caught:
        choose(plate(), "argyris")
    assert str(caught.value) == (
        "there is no element 'argyris'; the elements are dkt, hct, quintic, or 'auto' "
        "for the one that suits the plate."
    )


def test_every_element_has_its_number_of_triangles():
    assert set(TRIANGLES) == set(ELEMENTS)
    assert max(TRIANGLES.values()) < MOST


# Solving


@pytest.mark.parametrize(
    ("stated", "name"),
    [
        (plate(), "C1 quintic triangle of Argyris"),
        (plate(HOLED), "C1 quintic triangle of Argyris"),
        (plate(SEAMED, rib=CLAMPED), "Hsieh-Clough-Tocher triangle"),
    ],
    ids=["square", "square with a round hole", "clamped seam"],
)
def test_solving_takes_the_element_that_suits(stated, name):
    for options in ({}, {"element": "auto"}):
        solution = solve(stated, LOAD, triangles=60, **options)
        assert solution.state.element.name == name


@pytest.mark.parametrize("element", ELEMENTS)
def test_solving_takes_the_element_that_is_asked_for(element):
    solution = solve(plate(), LOAD, triangles=60, element=element)
    assert solution.state.element is ELEMENTS[element]


def test_solving_refuses_the_quintic_where_a_seam_is_clamped():
    with pytest.raises(InputError) as caught:
        solve(KINKED["a clamped seam"][0], LOAD, triangles=60, element="quintic")
    assert str(caught.value) == (
        "the quintic would give wrong moments: seam rib holds the slope; use element "
        "'auto', 'hct' or 'dkt'."
    )


@pytest.mark.parametrize("element", ["auto", "hct"])
def test_the_number_of_triangles_is_that_of_the_element(element):
    """If nobody says: 3,000 quintics, 10,000 of HCT; Gmsh comes within a tenth."""
    solution = solve(plate(), LOAD, element=element)
    wanted = TRIANGLES["quintic" if element == "auto" else element]
    assert len(solution.mesh.triangles) == pytest.approx(wanted, rel=0.1)


@pytest.mark.parametrize("asked", [{"triangles": 60}, {"size": 0.2}])
def test_more_triangles_than_memory_has_room_for_take_dkt(monkeypatch, asked):
    """Edges of 0.2 m on 1 m2 make 58 triangles of 0.0173 m2 each."""
    monkeypatch.setattr("kplate.choice.MOST", 50)
    solution = solve(plate(), LOAD, **asked)
    assert solution.state.element is ELEMENTS["dkt"]
    monkeypatch.setattr("kplate.choice.MOST", 70)
    solution = solve(plate(), LOAD, **asked)
    assert solution.state.element is ELEMENTS["quintic"]


# The panel file


@pytest.fixture
def read(tmp_path):
    return partial(read_text, tmp_path)


def with_element(value):
    return changed('name = "lid"', f'name = "lid"\nelement = {value}\ntriangles = 300')


def test_a_panel_that_names_no_element_leaves_the_choice(read):
    assert read(BASE).element == "auto"


@pytest.mark.parametrize("element", ["auto", *ELEMENTS])
def test_a_panel_names_its_element(read, element):
    assert read(with_element(f'"{element}"')).element == element


@pytest.mark.parametrize(
    ("value", "message"),
    [
        (
            '"DKT"',
            "[panel] element = 'DKT': it must be one of auto, dkt, hct, quintic.",
        ),
        (
            '"quintik"',
            "[panel] element = 'quintik': it must be one of auto, dkt, hct, quintic. "
            "Did you mean 'quintic'?",
        ),
        (
            "3",
            "[panel] element = 3: it must be one of auto, dkt, hct, quintic.",
        ),
    ],
)
def test_an_element_that_a_panel_may_not_name_is_refused(read, value, message):
    with pytest.raises(InputError) as caught:
        read(with_element(value))
    assert str(caught.value) == message


HOLE = "[[hole]]\ncircle = { centre = [200, 450], diameter = 200 }\n\n[supports]"


@pytest.mark.parametrize(
    ("text", "words"),
    [
        (with_element('"auto"'), "C1 quintic triangle of Argyris."),
        (with_element('"dkt"'), "discrete Kirchhoff triangle."),
        (
            with_element('"auto"').replace("[supports]", HOLE),
            "C1 quintic triangle of Argyris.",
        ),
    ],
    ids=["auto", "dkt", "auto with a round hole"],
)
def test_checking_a_panel_names_the_element_and_why(tmp_path, text, words):
    path = tmp_path / "lid.toml"
    path.write_text(text, encoding="utf-8")
    said = check(path).text
    (line,) = [line for line in said.splitlines() if "asked for)" in line]
    assert f"triangles (300 asked for): {words}" in line
