"""The record as strict JSON, and the reactions as a table."""

import csv
import functools
import json
import math
from dataclasses import fields, replace
from typing import get_args

import numpy as np
import pytest
import pyvista

from kplate.adapt import solve
from kplate.errors import InputError
from kplate.loads import (
    DiscPatch,
    Hydrostatic,
    Load,
    PointForce,
    Pressure,
    PressureField,
    RectanglePatch,
    SelfWeight,
)
from kplate.materials import STEEL
from kplate.outline import Outline
from kplate.output.forcerows import COLUMNS, write_reactions
from kplate.output.record import LOADS, PEAKS, solution_record, write_json
from kplate.output.vtk import write_vtk
from kplate.peaks import QUANTITIES
from kplate.plate import Plate
from kplate.polygon import Polygon
from kplate.shapes import Circle
from kplate.supports import SIMPLY_SUPPORTED


def gust(x, y):
    """A pressure that rises with x, in Pa."""
    return -1e3 * (1.0 + x + 0.0 * y)


class Gust:
    """The same as an object."""

    def __call__(self, x, y):
        return gust(x, y)


def plain(value):
    """Whether a value is made of plain JSON types alone."""
    if type(value) is dict:
        return all(type(key) is str and plain(v) for key, v in value.items())
    if type(value) is list:
        return all(map(plain, value))
    return value is None or type(value) in (str, int, float, bool)


@pytest.fixture(scope="module")
def record(cover):
    return solution_record(cover, "1.2.3")


@pytest.fixture
def rows(cover, tmp_path):
    path = write_reactions(cover, tmp_path / "reactions.csv")
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def test_the_record_is_strict_json_of_plain_types_and_reads_back_equal(
    record, tmp_path
):
    assert plain(record)
    path = write_json(record, tmp_path / "record.json")

    def refuse(word):
        raise AssertionError(word)  # NaN, Infinity

    text = path.read_text("utf-8")
    assert json.loads(text, parse_constant=refuse) == record
    assert text.endswith("}\n")


def test_the_same_record_gives_the_same_bytes(cover, record, tmp_path):
    first = write_json(record, tmp_path / "a.json").read_bytes()
    again = solution_record(replace(cover), "1.2.3")
    assert write_json(again, tmp_path / "b.json").read_bytes() == first


def test_the_record_says_what_was_stated(record):
    stated = record["statement"]
    assert record["kplate"] == "1.2.3"
    assert stated["outline"]["rim"] == {
        "shape": "polygon",
        "points [m]": [
            [0.0, 0.0],
            [1.6, 0.0],
            [1.6, 0.8],
            [1.0, 0.8],
            [1.0, 1.2],
            [0.0, 1.2],
        ],
        "sides": ["south", "east", "notch-south", "notch-east", "north", "west"],
    }
    assert stated["outline"]["holes"] == [
        {
            "shape": "circle",
            "centre [m]": [0.45, 0.4],
            "radius [m]": 0.12,
            "sides": ["shaft"],
        }
    ]
    area = 1.6 * 0.8 + 1.0 * 0.4 - math.pi * 0.12**2
    assert stated["outline"]["area [m2]"] == pytest.approx(area, rel=1e-12)
    assert stated["mass [kg]"] == pytest.approx(7850.0 * 0.012 * area, rel=1e-12)
    assert stated["thickness [m]"] == 0.012
    assert stated["material"] == {
        "name": "steel S235",
        "E [Pa]": 210e9,
        "nu": 0.3,
        "density [kg/m3]": 7850.0,
        "source": STEEL.source,
    }
    assert stated["supports"]["south"] == {
        "name": "clamped",
        "words": "w = 0, rotation held, uplift held",
    }
    assert stated["supports"]["shaft"] == {"name": "free", "words": "nothing held"}
    assert stated["cases"] == [
        {
            "name": "crowd",
            "loads": [
                {"kind": "pressure", "value [Pa]": -5e3, "zone": None},
                {"kind": "self-weight", "acceleration [m/s2]": -9.80665},
            ],
        },
        {
            "name": "jack",
            "loads": [{"kind": "point force", "force [N]": 2e3, "at [m]": [1.35, 0.4]}],
        },
    ]


def test_what_lies_inside_is_recorded_with_its_loads_and_supports(deck):
    record = solution_record(deck, "0")
    assert plain(record)
    stated = record["statement"]
    (pad,) = stated["outline"]["zones"]
    area = math.pi * 0.12**2
    assert pad.pop("area [m2]") == pytest.approx(area, rel=1e-5)
    assert (pad["name"], pad["sides"]) == ("pad", ["edge", "edge"])
    (section,) = stated["zones"]
    assert (section["name"], section["thickness [m]"]) == ("pad", 0.012)
    assert section["material"]["name"] == "aluminium 5083"
    assert stated["outline"]["seams"] == [
        {"name": "sill", "points [m]": [[0.6, 0.0], [0.6, 0.8]]},
        {"name": "track", "points [m]": [[0.8, 0.4], [1.0, 0.6]], "bulges": [0.2]},
    ]
    assert stated["outline"]["marks"][0] == {"name": "bolt", "at [m]": [0.9, 0.4]}
    assert stated["outline"]["rim"]["bulges"] == [0.0, 0.25, 0.0, 0.0]
    words = {name: held["name"] for name, held in stated["supports"].items()}
    assert words == {
        "south": "free",
        "bow": "clamped",
        "north": "free",
        "west": "guided",
        "oval": "free",
        "slot": "free",
        "sill": "simply supported",
        "track": "free",
        "bolt": "simply supported",
        "stud": "simply supported",
        "lamp": "free",
    }
    assert stated["cases"][0]["loads"] == [
        {"kind": "pressure", "value [Pa]": -5e3, "zone": "pad"},
        {"kind": "line force", "force [N/m]": -1e3, "along": "track"},
        {"kind": "edge moment", "moment [N]": 50.0, "along": "north"},
        {"kind": "point moment", "moment [N m]": [0.0, -20.0], "at [m]": [1.1, 0.6]},
    ]


def test_notes_of_the_outline_are_recorded():
    angles = 2.0 * np.pi * np.arange(48) / 48
    points = np.column_stack([np.cos(angles), np.sin(angles)])
    plate = Plate(
        outline=Outline.polygon(points, sides=["rim"] * 48),
        thickness=0.01,
        material=STEEL,
        supports={"rim": SIMPLY_SUPPORTED},
    )
    record = solution_record(solve(plate, [Pressure(-1.0)], triangles=100), "0")
    (note,) = record["statement"]["outline"]["notes"]
    assert "48 chords of 'rim'" in note


def test_point_supports_are_recorded_and_close_the_balance(deck, tmp_path):
    (result,) = solution_record(deck, "0")["results"]
    reactions = result["reactions"]
    bolt, stud = reactions["points"]
    assert (bolt["mark"], bolt["support"]) == ("bolt", "simply supported")
    assert bolt["place [m]"] == [0.9, 0.4]
    assert (stud["mark"], stud["support"]) == ("stud", "simply supported")
    # About the origin a force at (x, y) has the moments y F and -x F, and no more where
    # slopes are free.
    assert bolt["moment_x [N m]"] == pytest.approx(0.4 * bolt["force [N]"])
    assert bolt["moment_y [N m]"] == pytest.approx(-0.9 * bolt["force [N]"])
    path = write_reactions(deck, tmp_path / "reactions.csv")
    with path.open(encoding="utf-8", newline="") as file:
        table = list(csv.DictReader(file))
    points = [row for row in table if row["kind"] == "point"]
    assert [(row["side"], row["x [m]"]) for row in points] == [
        ("bolt", "0.9"),
        ("stud", "0.45"),
    ]
    assert float(points[0]["force [N]"]) == bolt["force [N]"]
    assert "sill" in {row["side"] for row in table if row["kind"] == "side"}
    (rest,) = (row for row in table if row["kind"] == "sum")
    (loads,) = (row for row in table if row["kind"] == "loads")
    for column in COLUMNS[8:]:
        scale = abs(float(loads["force [N]"]))
        assert float(rest[column]) == pytest.approx(0.0, abs=1e-9 * scale)


def test_every_kind_of_load_is_known_with_all_its_fields():
    assert set(LOADS) == set(get_args(Load))
    for kind, (_, units) in LOADS.items():
        assert list(units) == [field.name for field in fields(kind)]


def test_every_peak_is_recorded():
    assert list(PEAKS) == list(QUANTITIES)


def test_loads_are_recorded_with_every_field(tmp_path):
    plate = Plate(
        outline=Outline.circle((0.0, 0.0), radius=1.0).cut(
            Polygon(
                points=[(-0.2, -0.2), (0.2, -0.2), (0.2, 0.2)], sides=("a", "b", "c")
            ),
            Circle(centre=(0.6, 0.0), radius=0.1, name="d"),
        ),
        thickness=0.01,
        material=replace(STEEL, density=None),
        supports={"rim": SIMPLY_SUPPORTED},
    )
    loads = [
        Hydrostatic(level=0.5, specific_weight=-9810),
        PressureField(gust),
        PressureField(Gust()),
        PressureField(functools.partial(gust)),
        RectanglePatch(force=-3, centre=(0, 0.5), size=(0.1, 0.2), angle=0.5),
        DiscPatch(force=np.float32(-4), centre=(0, -0.5), radius=0.1),
    ]
    record = solution_record(solve(plate, loads, triangles=300), "0")
    assert plain(record)
    assert record["statement"]["mass [kg]"] is None
    assert record["statement"]["material"]["density [kg/m3]"] is None
    assert record["statement"]["outline"]["rim"]["radius [m]"] == 1.0
    assert record["statement"]["cases"] == [
        {
            "name": "load",
            "loads": [
                {
                    "kind": "hydrostatic pressure",
                    "level [m]": 0.5,
                    "specific_weight [N/m3]": -9810.0,
                    "up": [0.0, 1.0],
                },
                {"kind": "pressure field", "function": f"{__name__}.gust"},
                {"kind": "pressure field", "function": f"{__name__}.Gust"},
                {"kind": "pressure field", "function": "functools.partial"},
                {
                    "kind": "rectangle patch",
                    "force [N]": -3.0,
                    "centre [m]": [0.0, 0.5],
                    "size [m]": [0.1, 0.2],
                    "angle [rad]": 0.5,
                },
                {
                    "kind": "disc patch",
                    "force [N]": -4.0,
                    "centre [m]": [0.0, -0.5],
                    "radius [m]": 0.1,
                },
            ],
        }
    ]
    assert {Pressure, PointForce, SelfWeight} < set(LOADS)  # in the other panel


def test_the_record_holds_every_peak_with_its_place(cover, record):
    for result, case in zip(record["results"], cover.cases, strict=True):
        assert result["case"] == case
        for quantity, unit in PEAKS.items():
            peak = cover.peak(quantity, case=case)
            assert result["peaks"][f"{quantity} [{unit}]"] == {
                "value": peak.value,
                "kind": "none",
                "lower": None,
                "upper": None,
                "place [m]": list(peak.place),
                "face": peak.face,
            }


def test_loads_work_twice_the_strain_energy_in_the_record(record):
    for result in record["results"]:
        assert result["strain energy [J]"] > 0.0
        assert result["load work [J]"] == pytest.approx(
            2.0 * result["strain energy [J]"], rel=1e-9
        )


def test_recorded_forces_balance_and_an_unbounded_corner_is_null_with_its_reason(
    record,
):
    for result in record["results"]:
        found = result["reactions"]
        assert found["imbalance"] < 1e-9
        for key in ("force [N]", "moment_x [N m]", "moment_y [N m]"):
            assert found["supports"][key] == pytest.approx(
                -found["loads"][key], abs=1e-6
            )
        forces = {tuple(c["sides"]): c["force [N]"] for c in found["corners"]}
        notch = forces["notch-south", "notch-east"]
        assert notch["value"] is None
        assert notch["reason"].startswith("no finite value: corner of 270 degrees")
        known = [f["value"] for f in forces.values() if f["value"] is not None]
        sides = sum(side["force [N]"] for side in found["sides"])
        assert sum(known) + sides == pytest.approx(found["supports"]["force [N]"])


def test_excluded_places_are_recorded_with_radius_reason_and_case(cover, record):
    assert [
        (tuple(e["place [m]"]), e["radius [m]"], e["reason"], e["case"])
        for e in record["excluded"]
    ] == [(e.place, e.radius, e.reason, e.case or None) for e in cover.excluded]
    assert {
        "place [m]": [1.35, 0.4],
        "radius [m]": 0.012,
        "reason": "point force",
        "case": "jack",
    } in record["excluded"]


def test_the_record_names_what_the_vtu_file_cannot(cover, record, tmp_path):
    written = pyvista.read(write_vtk(cover, tmp_path / "cover.vtu"))
    assert sorted(record["field_names"]) == sorted(written.point_data.keys())
    assert record["field_names"]["jack: moments [N]"] == {
        "case": "jack",
        "field": "moments [N]",
    }
    names = record["side_names"]
    used = np.unique(written.cell_data["side"])
    assert sorted(used) == [-1, *range(len(names))]
    south = written.cell_data["side"] == names.index("south")
    assert not written.extract_cells(south).points[:, 1].any()
    assert record["mesh"]["triangles"] == len(cover.mesh.triangles)
    assert record["mesh"]["unknowns"] == cover.state.constraints.numbering.count
    assert record["mesh"]["field triangles"] == len(cover.field_triangles)
    assert record["mesh"]["field points"] == len(cover.field_points)


@pytest.mark.parametrize("value", [math.nan, math.inf, np.ones(2), object()])
def test_what_json_has_no_word_for_is_refused_and_the_old_file_kept(tmp_path, value):
    path = tmp_path / "a.json"
    path.write_text("old")
    with pytest.raises(InputError, match="JSON has no word for something in the rec"):
        write_json({"a": [value]}, path)
    assert path.read_text() == "old"


def test_side_names_of_any_letters_stand_as_they_are(tmp_path):
    path = write_json({"side": "Süd 南"}, tmp_path / "a.json")
    assert "Süd 南" in path.read_text("utf-8")


def test_sides_and_corners_balance_the_loads_in_the_table(cover, rows):
    for case in cover.cases:
        own = [row for row in rows if row["case"] == case]
        loads = [row for row in own if row["kind"] == "loads"]
        sums = [row for row in own if row["kind"] == "sum"]
        assert (len(loads), len(sums)) == (1, 1)
        for column, size in zip(COLUMNS[8:], (1.0, 1.6, 1.6), strict=True):
            supports = sum(
                float(row[column])
                for row in own
                if row["kind"] in ("side", "corner") and row[column]
            )
            load, rest = float(loads[0][column]), float(sums[0][column])
            scale = abs(float(loads[0]["force [N]"])) * size
            assert supports == pytest.approx(-load, abs=1e-9 * scale)
            assert rest == pytest.approx(0.0, abs=1e-9 * scale)


def test_loads_in_the_table_are_the_stated_ones(rows):
    loads = {row["case"]: row for row in rows if row["kind"] == "loads"}
    jack = loads["jack"]
    assert float(jack["force [N]"]) == pytest.approx(2e3)
    assert float(jack["moment_x [N m]"]) == pytest.approx(0.4 * 2e3)
    assert float(jack["moment_y [N m]"]) == pytest.approx(-1.35 * 2e3)
    # The mesh has chords for the shaft's circle, the loads the area of the plate.
    area = 1.6 * 0.8 + 1.0 * 0.4 - math.pi * 0.12**2
    weight = area * (5e3 + 7850.0 * 9.80665 * 0.012)
    assert float(loads["crowd"]["force [N]"]) == pytest.approx(-weight, rel=1e-3)


def test_stations_carry_what_the_solution_says(cover, rows):
    for side in cover.reactions(case="crowd").sides:
        own = [
            row
            for row in rows
            if (row["case"], row["kind"], row["side"])
            == ("crowd", "station", side.side)
        ]
        found = np.array(
            [[float(row[c]) if row[c] else np.nan for c in COLUMNS[3:8]] for row in own]
        )
        np.testing.assert_array_equal(found[:, :2], side.stations)
        np.testing.assert_array_equal(found[:, 2], side.distance)
        np.testing.assert_array_equal(found[:, 3], side.line_reaction)
        np.testing.assert_array_equal(found[:, 4], side.line_moment)
        assert all(row["force [N]"] == row["moment_x [N m]"] == "" for row in own)


def test_an_unbounded_corner_is_blank_in_the_table(rows):
    corner = [
        row
        for row in rows
        if row["kind"] == "corner" and row["side"] == "notch-south / notch-east"
    ]
    assert len(corner) == 2  # one a case
    assert [corner[0][c] for c in COLUMNS[3:]] == ["1.0", "0.8", *[""] * 6]
    at_corner = [
        row
        for row in rows
        if row["kind"] == "station"
        and (row["x [m]"], row["y [m]"], row["side"]) == ("1.0", "0.8", "notch-south")
    ]
    assert [row["line reaction [N/m]"] for row in at_corner] == ["", ""]


def test_side_names_with_commas_and_quotes_come_back(tmp_path):
    name = 'the "long" side, south'
    plate = Plate(
        outline=Outline.polygon(
            [(0, 0), (1, 0), (0, 1)], sides=[name, "hypotenuse", "west"]
        ),
        thickness=0.01,
        material=STEEL,
        supports={name: SIMPLY_SUPPORTED, "west": SIMPLY_SUPPORTED},
    )
    found = solve(plate, [Pressure(-1.0)], triangles=100)
    path = write_reactions(found, tmp_path / "a.csv")
    with path.open(encoding="utf-8", newline="") as file:
        table = list(csv.DictReader(file))
    assert name in {row["side"] for row in table}
    assert tuple(table[0]) == COLUMNS
