"""Loads of a panel file act in the sense that their words say."""

import math
from functools import partial

import numpy as np
import pytest
from panel_texts import read_text, with_load

from kplate.adapt import solve
from kplate.errors import InputError
from kplate.loads import (
    EdgeMoment,
    LineForce,
    PointForce,
    PointMoment,
    Pressure,
    RectanglePatch,
)

INSIDE = """
[[zone]]
name = "pad"
rectangle = { centre = [200, 200], size = [100, 80] }

[[seam]]
name = "rib"
points = [[100, 450], [500, 450]]

[[mark]]
name = "bolt"
at = [600, 150]
"""


@pytest.fixture
def read(tmp_path):
    return partial(read_text, tmp_path)


def inside(load: str) -> str:
    """The lid with a zone, a seam and a mark, under one load."""
    return with_load(load).replace("[supports]", f"{INSIDE}\n[supports]")


def solved(panel, triangles=400):
    return solve(panel.plate, panel.cases, triangles=triangles)


@pytest.mark.parametrize(
    ("stated", "load"),
    [
        ('{ pressure = "5 kPa down", on = "pad" }', Pressure(-5e3, zone="pad")),
        (
            '{ line = "2 kN/m down", along = "rib" }',
            LineForce(force=-2e3, along="rib"),
        ),
        (
            '{ line = "10 lbf/ft up", along = "east" }',
            LineForce(force=10 * 0.45359237 * 9.80665 / 0.3048, along="east"),
        ),
        (
            '{ edge_moment = "100 N m/m", along = "east", stretches = "bottom" }',
            EdgeMoment(moment=100.0, along="east"),
        ),
        (
            '{ edge_moment = "0.1 kN", along = "east", stretches = "top" }',
            EdgeMoment(moment=-100.0, along="east"),
        ),
        (
            '{ moment = "50 N m", lifts = "+x", at = "bolt" }',
            PointMoment(moment=(0.0, -50.0), at=(0.6, 0.15)),
        ),
        (
            '{ moment = "5e4 N mm", lifts = "-y", at = ["0.4 m", "300 mm"] }',
            PointMoment(moment=(-50.0, 0.0), at=(0.4, 0.3)),
        ),
        (
            '{ force = "1 kN down", at = "bolt" }',
            PointForce(force=-1e3, at=(0.6, 0.15)),
        ),
        (
            '{ force = "1 kN down", over = "2 cm x 3 cm", at = "bolt" }',
            RectanglePatch(force=-1e3, centre=(0.6, 0.15), size=(0.02, 0.03)),
        ),
    ],
)
def test_loads_in_si_units_with_the_signs_of_the_package(read, stated, load):
    ((found,),) = [case.loads for case in read(inside(stated)).cases]
    assert type(found) is type(load)
    for name, value in vars(load).items():
        same = value if isinstance(value, str) else pytest.approx(value, rel=1e-12)
        assert getattr(found, name) == same, name


@pytest.mark.parametrize(
    ("stated", "force", "place"),
    [
        ('{ pressure = "5 kPa down", on = "pad" }', -5e3 * 0.1 * 0.08, (0.2, 0.2)),
        ('{ line = "2 kN/m down", along = "rib" }', -2e3 * 0.4, (0.3, 0.45)),
        ('{ line = "1 kN/m up", along = "east" }', 1e3 * 0.6, (0.8, 0.3)),
        ('{ force = "1 kN down", at = "bolt" }', -1e3, (0.6, 0.15)),
    ],
)
def test_a_load_has_its_force_at_its_place(read, stated, force, place):
    found = solved(read(inside(stated))).reactions().load
    assert found.force == pytest.approx(force, rel=1e-9)
    assert found.moment_x == pytest.approx(place[1] * force, rel=1e-9)
    assert found.moment_y == pytest.approx(-place[0] * force, rel=1e-9)


@pytest.mark.parametrize(("face", "way"), [("bottom", -1.0), ("top", 1.0)])
def test_an_edge_moment_stretches_the_face_it_names(read, face, way):
    """A strip between two supports sags where its bottom is stretched.

    With nu = 0 a strip of span L under moments M at both ends has w = M x (L - x) / 2 D
    all over, from w,xx = -M / D: exactly what the element holds.
    """
    loads = ", ".join(
        f'{{ edge_moment = "300 N m/m", along = "{side}", stretches = "{face}" }}'
        for side in ("east", "west")
    )
    text = (
        with_load(loads)
        .replace('"steel S235"', '{ name = "own", E = "210 GPa", nu = 0 }')
        .replace(
            'south = "clamped"', 'east = "simply supported"\nwest = "simply supported"'
        )
    )
    solution = solved(read(text))
    D = 210e9 * 0.010**3 / 12
    x = solution.mesh.points[:, 0]
    w = solution.deflection(solution.mesh.points)
    np.testing.assert_allclose(w, way * 300.0 * x * (0.8 - x) / (2 * D), atol=1e-9)
    places = [(0.4, 0.3)]
    stress = solution.stresses(places, face=face)
    assert stress[0, 0] == pytest.approx(6 * 300.0 / 0.010**2, rel=1e-6)


@pytest.mark.parametrize(
    ("lifts", "way"),
    [("+x", (1, 0)), ("-x", (-1, 0)), ("+y", (0, 1)), ("-y", (0, -1))],
)
def test_a_couple_lifts_the_plate_on_the_side_it_names(read, lifts, way):
    load = f'{{ moment = "50 N m", lifts = "{lifts}", at = ["400 mm", "300 mm"] }}'
    held = "\n".join(
        f'{side} = "simply supported"' for side in ("south", "east", "north", "west")
    )
    solution = solved(read(with_load(load).replace('south = "clamped"', held)))
    step = 0.1 * np.array(way)
    middle = np.array([0.4, 0.3])
    up, down = solution.deflection([middle + step, middle - step])
    assert up > 0.0 > down
    assert up == pytest.approx(-down, rel=0.05)  # of a plate that is symmetric
    assert solution.reactions().load.force == pytest.approx(0.0, abs=1e-9)
    about = solution.reactions().load.moment_x, solution.reactions().load.moment_y
    assert math.hypot(*about) == pytest.approx(50.0, rel=1e-9)


LOAD_1 = "[[case]] 1 'wheel', load 1"


@pytest.mark.parametrize(
    ("stated", "message"),
    [
        (
            '{ pressure = "5 kPa down", on = "pat" }',
            "on = 'pat': there is no such zone; the names are 'pad'. Did you mean "
            "'pad'?",
        ),
        (
            '{ line = "2 kN/m", along = "rib" }',
            "line = '2 kN/m': a load says up or down in words, such as "
            '"2 kN/m down".',
        ),
        (
            '{ line = "2 kN down", along = "rib" }',
            "line = '2 kN down': 'kN' is no unit of line force; write it such as "
            '"2 kN/m".',
        ),
        (
            '{ line = "2 kN/m down", along = "pad" }',
            "along = 'pad': there is no such side or seam; the names are 'south', "
            "'east', 'north', 'west', 'rib'.",
        ),
        (
            '{ edge_moment = "100 N m/m", along = "rib", stretches = "top" }',
            "along = 'rib': there is no such side; the names are 'south', 'east', "
            "'north', 'west'.",
        ),
        (
            '{ edge_moment = "-100 N m/m", along = "east", stretches = "top" }',
            "edge_moment = '-100 N m/m': it must be a positive line moment.",
        ),
        (
            '{ edge_moment = "100 N m", along = "east", stretches = "top" }',
            "edge_moment = '100 N m': 'N m' is no unit of line moment; write it such "
            'as "100 N m/m".',
        ),
        (
            '{ edge_moment = "100 N", along = "east" }',
            'stretches is missing; add stretches = "top".',
        ),
        (
            '{ edge_moment = "100 N", along = "east", stretches = "up" }',
            "stretches = 'up': it must be one of bottom, top.",
        ),
        (
            '{ moment = "50 N", lifts = "+x", at = "bolt" }',
            "moment = '50 N': 'N' is no unit of moment; write it such as \"50 N m\".",
        ),
        (
            '{ moment = "-50 N m", lifts = "+x", at = "bolt" }',
            "moment = '-50 N m': it must be a positive moment.",
        ),
        (
            '{ moment = "50 N m", lifts = "east", at = "bolt" }',
            "lifts = 'east': it must be one of +x, -x, +y, -y.",
        ),
        (
            '{ force = "1 kN down", at = "rib" }',
            "at = 'rib': there is no such mark; the names are 'bolt'.",
        ),
    ],
)
def test_a_mistake_is_named(read, stated, message):
    with pytest.raises(InputError) as caught:
        read(inside(stated))
    assert str(caught.value) == f"{LOAD_1}: {message}"


def test_a_mark_where_there_is_none(read):
    with pytest.raises(InputError) as caught:
        read(with_load('{ force = "1 kN down", at = "bolt" }'))
    assert str(caught.value) == (
        f"{LOAD_1}: at = 'bolt': there is no such mark; there is none."
    )


def test_self_weight_needs_the_density_of_each_zone(read):
    own = '{ name = "own", E = "11 GPa", nu = 0.3 }'
    text = inside('{ self_weight = "down" }').replace(
        'name = "pad"', f'name = "pad"\nmaterial = {own}'
    )
    with pytest.raises(InputError, match="material 'own' states no density; add it"):
        read(text)
