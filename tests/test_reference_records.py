"""The records of benchmarks/reference_static.json, well formed and recomputed.

Where an exact solution of oracles.py fits a record, its values are computed again to
the digits it states; all are checked for their form and the signs of their values.
"TW" is the book named in test_oracles.py.
"""

from collections.abc import Callable
from dataclasses import replace
from functools import partial
from itertools import pairwise

import numpy as np
import oracles
import oracles_rings
import pytest
from oracles_ritz import ritz_square
from oracles_series import Band, banded

from benchmarks import records

INSIDE = ("zones", "seams", "marks")
REFERENCE = records.reference()
RECORDS = {record["id"]: record for record in REFERENCE["records"]}


def side_words(record: dict) -> list[str]:
    return [record["supports"].get(s, "free") for s in record["outline"]["sides"]]


def load_of(record: dict) -> oracles.Load:
    load = record["load"]
    if load["kind"] == "uniform":
        return oracles.LinearPressure(at_origin=load["pressure"])
    if load["kind"] == "linear":
        gradient = tuple(load["gradient"])
        return oracles.LinearPressure(at_origin=load["at_origin"], gradient=gradient)
    if load["kind"] == "patch":
        centre, size = tuple(load["centre"]), tuple(load["size"])
        return oracles.PatchForce(centre=centre, size=size, force=load["force"])
    return oracles.PointForce(at=tuple(load["at"]), force=load["force"])


def is_striped(record: dict) -> bool:
    """Whether lines along x part it or load it."""
    lined = record["load"]["kind"] in {"line", "edge moment"}
    inside = lined or "zones" in record or "seams" in record
    return inside and "polygon" in record["outline"] and not record["holes"]


def is_plain(record: dict) -> bool:
    """Whether its load is one of those of the series, on an outline they know."""
    kinds = {"uniform", "linear", "patch", "point"}
    known = record["load"]["kind"] in kinds
    return known and not {"bulges", "ellipse"} & set(record["outline"])


def is_rectangle(record: dict) -> bool:
    polygon = np.array(record["outline"].get("polygon", [(0, 0)]))
    a, b = polygon.max(axis=0)
    square = np.array([(0, 0), (a, 0), (a, b), (0, b)])
    return (
        not record["holes"]
        and polygon.shape == square.shape
        and bool((polygon == square).all())
    )


def oracle(record: dict) -> Callable | None:
    """Return the solution of a record as a function of points, where there is one."""
    if is_striped(record) or "marks" in record or not is_plain(record):
        return None
    load, nu, kind = load_of(record), record["nu"], record["load"]["kind"]
    supports, name = record["supports"], record["id"]
    if name == "tri_eq_s_u":
        c = oracles.triangle(1.0, load.at_origin)
        return partial(oracles.polynomial, coefficients=c, nu=nu)
    if name.endswith("_lin"):
        c = oracles.tilted_disc(1.0, supports["rim"], load.gradient[0], nu=nu)
        return partial(oracles.polynomial, coefficients=c, nu=nu)
    if not is_rectangle(record):
        return None
    size = tuple(record["outline"]["polygon"][2])
    south, east, north, west = side_words(record)
    if "guided" in (south, east, north, west):
        return None
    given = {"size": size, "load": load, "nu": nu}
    if {south, east, north, west} == {"simply supported"}:
        return partial(oracles.navier, **given)
    if east == west == "simply supported":
        return partial(oracles.levy, ends=(south, north), **given)
    if {south, east, north, west} == {"clamped"} and kind != "point":
        return partial(oracles.clamped_rectangle, **given)
    return None


def reading(record: dict, state: oracles.State, k: int) -> float:
    """Read quantity k of a record from the state at the places of its quantities."""
    (x, y), word = record["quantities"][k]["at"], record["quantities"][k]["quantity"]
    moments = dict(zip(("m_xx", "m_yy", "m_xy"), state.moments[k], strict=True))
    if word == "deflection":
        return float(state.w[k])
    if word == "corner force":
        return float(moments["m_xy"] * (2.0 if (x == 0.0) == (y == 0.0) else -2.0))
    if word == "shear":
        return float(state.shears[k] @ record["quantities"][k]["normal"])
    if word == "line reaction":
        low, high = np.min(vertices(record), 0), np.max(vertices(record), 0)
        v_x, v_y = state.effective_shears[k]
        faces = [(x, low[0], -v_x), (x, high[0], v_x)]
        faces += [(y, low[1], -v_y), (y, high[1], v_y)]
        return next(float(v) for at, face, v in faces if np.isclose(at, face))
    return float(moments[word])


def vertices(record: dict) -> np.ndarray:
    """Corners of the outline, or of the square around a disc."""
    if "polygon" in record["outline"]:
        return np.array(record["outline"]["polygon"])
    if "ellipse" in record["outline"]:
        half = 0.5 * np.array(record["outline"]["ellipse"]["size"])
        return np.stack([-half, half])
    circle = record["outline"]["circle"]
    centre, r = np.array(circle["centre"]), circle["radius"]
    return np.stack([centre - r, centre + r])


def round_values(record: dict) -> list[float]:
    """Quantities of a disc or a ring under a load about its axis, or a force."""
    at = np.array([quantity["at"] for quantity in record["quantities"]])
    load, supports, nu = load_of(record), record["supports"], record["nu"]
    if isinstance(load, oracles.PointForce) and load.at != (0.0, 0.0):
        return list(oracles.clamped_disc_force(at, 1.0, load))
    inner = record["holes"][0]["circle"]["radius"] if record["holes"] else 0.0
    if record["holes"]:
        words = supports.get("hole", "free"), supports.get("rim", "free")
        p = load.at_origin
        state = oracles.annulus(at[:, 0], (inner, 1.0), words, pressure=p, nu=nu)
    else:
        kind, size = record["load"]["kind"], {"uniform": "pressure", "point": "force"}
        given = {size[kind]: record["load"][size[kind]], "nu": nu}
        state = oracles.disc(at[:, 0], 1.0, supports["rim"], **given)
    reaction = np.where(at[:, 0] == inner, -state.q_r, state.q_r)
    found = {"deflection": state.w, "m_xx": state.m_rr, "m_yy": state.m_tt}
    found["line reaction"] = reaction
    words = [quantity["quantity"] for quantity in record["quantities"]]
    return [float(found[word][k]) for k, word in enumerate(words)]


def bands_of(record: dict) -> list[Band]:
    """Bands of a rectangle, one wide, between the lines along x that part it."""
    height, load = record["outline"]["polygon"][2][1], record["load"]
    zones = record.get("zones", [])
    joints = {y for zone in zones for _, y in zone["polygon"]} - {0.0, height}
    joints |= {y for seam in record.get("seams", []) for _, y in seam["points"]}
    ends = [0.0, *sorted(joints), height]
    bands = []
    for low, high in pairwise(ends):
        own = {z["name"]: z for z in zones if z["polygon"][0] == [0.0, low]}
        assert all(z["polygon"][2] == [1.0, high] for z in own.values())
        thickness = next((z["thickness"] for z in own.values()), 1.0)
        loaded = load.get("zone", "") in ("", *own)
        pressure = load["pressure"] if loaded and load["kind"] == "uniform" else 0.0
        band = Band(width=high - low, rigidity=thickness**3, nu=record["nu"])
        bands.append(replace(band, pressure=pressure))
    return bands


def banded_values(record: dict) -> list[float]:
    """Quantities of a rectangle parted by lines along x, or bent by edge moments."""
    load, (south, east, north, west) = record["load"], side_words(record)
    assert east == west == "simply supported"
    bands, seams = bands_of(record), record.get("seams", [])
    moments = [
        load.get("moment", 0.0) * (side == load.get("along"))
        for side in record["outline"]["sides"]
    ]
    more = {
        "walls": any(seam["name"] in record["supports"] for seam in seams),
        "line_force": load["force"] if load["kind"] == "line" else 0.0,
        "end_moments": (moments[0], moments[2]),
    }

    places = np.array([quantity["at"] for quantity in record["quantities"]])
    states = []  # of every band at every place; only those in it are read
    for number, band in enumerate(bands):
        W = banded(places, number, bands, (south, north), **more)
        states.append(oracles.State(derivatives=W, nu=band.nu, rigidity=band.rigidity))
    found = []
    for k, quantity in enumerate(record["quantities"]):
        y, word = quantity["at"][1], quantity["quantity"]
        above = y + 1e-9 * quantity.get("toward", [0.0, -1.0])[1] > bands[0].width
        own = states[int(above)]
        if word == "deflection":
            found.append(own.w[k])
        elif word == "line reaction":
            shears = [state.effective_shears[k, 1] for state in states]
            assert y in (0.0, bands[0].width)  # a wall carries both of its sides
            found.append(-shears[0] if y == 0.0 else shears[0] - shears[1])
        else:
            found.append(own.moments[k, ("m_xx", "m_yy", "m_xy").index(word)])
    return [float(value) for value in found]


def column_values(record: dict) -> list[float]:
    """A simply supported plate on a column: two of Navier's problems, w = 0 at it."""
    size, at = tuple(record["outline"]["polygon"][2]), record["marks"][0]["at"]
    assert set(side_words(record)) == {"simply supported"}
    places = [at, *(quantity["at"] for quantity in record["quantities"])]
    load, push = load_of(record), oracles.PointForce(at=tuple(at))
    loaded, pushed = (
        oracles.navier(places, size, own, nu=record["nu"]) for own in (load, push)
    )
    force = -loaded.w[0] / pushed.w[0]
    w, m = loaded.w + force * pushed.w, loaded.moments + force * pushed.moments
    found = []
    for k, quantity in enumerate(record["quantities"], start=1):
        values = {"deflection": w[k], "point reaction": force}
        values |= dict(zip(("m_xx", "m_yy", "m_xy"), m[k], strict=True))
        found.append(float(values[quantity["quantity"]]))
    return found


ROUND = [
    name
    for name, record in RECORDS.items()
    if "circle" in record["outline"]
    and oracle(record) is None
    and is_plain(record)
    and not {"seams", "marks"} & set(record)
    and "guided" not in record["supports"].values()
]
SOLVED = [name for name, record in RECORDS.items() if oracle(record) is not None]
STRIPED = [name for name, record in RECORDS.items() if is_striped(record)]


@pytest.mark.parametrize("name", SOLVED + ROUND)
def test_records_with_a_closed_solution_are_recomputed(name):
    record = RECORDS[name]
    solution = oracle(record)
    if solution is None:
        found = round_values(record)
    else:
        state = solution([quantity["at"] for quantity in record["quantities"]])
        found = [reading(record, state, k) for k in range(len(record["quantities"]))]
    for value, quantity in zip(found, record["quantities"], strict=True):
        tolerance = 10.0 ** (1 - quantity["digits"])
        assert value == pytest.approx(quantity["value"], rel=tolerance), quantity


@pytest.mark.parametrize("name", STRIPED)
def test_records_with_lines_along_x_are_recomputed(name):
    record = RECORDS[name]
    for value, quantity in zip(
        banded_values(record), record["quantities"], strict=True
    ):
        tolerance = 10.0 ** (1 - quantity["digits"])
        assert value == pytest.approx(quantity["value"], rel=tolerance), quantity


def test_the_plate_on_a_column_is_recomputed():
    """Ten digits, less the two by which the parts of a moment exceed their sum."""
    record = RECORDS["column_ssss_1"]
    for value, quantity in zip(
        column_values(record), record["quantities"], strict=True
    ):
        assert quantity["digits"] == 10
        assert value == pytest.approx(quantity["value"], rel=1e-8), quantity


RINGS = [
    name
    for name, record in RECORDS.items()
    if "circle" in record["outline"]
    and name not in SOLVED + ROUND
    and not name.startswith("circ_pt")
]
SECTORS = [name for name, own in RECORDS.items() if name.startswith("sector")]


def ring_values(record: dict) -> list[float]:
    """Quantities of a disc or a ring loaded on circles about its axis."""
    load, supports = record["load"], record["supports"]
    radii = [hole["circle"]["radius"] for hole in record["holes"]]
    if load["kind"] == "disc patch" or "seams" in record:
        radii += [load.get("radius", 0.0) or record["seams"][0]["points"][0][0]]
    names = ["hole"] * bool(record["holes"]) + ["ring"] * (len(radii) > 0) + ["rim"]
    names = list(dict.fromkeys(names if not record["holes"] else ["hole", "rim"]))
    circles = [
        oracles_rings.Circle(
            radius=radius,
            support=supports.get(name, "free"),
            force=load.get("force", 0.0) * (load.get("along") == name),
            moment=load.get("moment", 0.0) * (load.get("along") == name),
        )
        for radius, name in zip([*radii, 1.0], names, strict=True)
    ]
    pressures = [0.0] * (len(circles) - bool(record["holes"]))
    if load["kind"] == "disc patch":
        pressures[0] = load["force"] / (np.pi * load["radius"] ** 2)
    if load["kind"] == "uniform":
        pressures = [load["pressure"]]
    at = np.array([quantity["at"] for quantity in record["quantities"]])
    assert not at[:, 1].any()
    state = oracles_rings.rings(
        at[:, 0], circles, pressures, inner_rim=bool(record["holes"]), nu=record["nu"]
    )
    inner = at[:, 0] == circles[0].radius
    found = {"deflection": state.w, "m_xx": state.m_rr, "m_yy": state.m_tt}
    found["line reaction"] = np.where(inner, -state.q_r, state.q_r)
    words = [quantity["quantity"] for quantity in record["quantities"]]
    return [float(found[word][k]) for k, word in enumerate(words)]


@pytest.mark.parametrize("name", RINGS)
def test_records_loaded_on_circles_are_recomputed(name):
    record = RECORDS[name]
    for value, quantity in zip(ring_values(record), record["quantities"], strict=True):
        assert value == pytest.approx(quantity["value"], rel=1e-9), quantity


@pytest.mark.parametrize("name", SECTORS)
def test_sectors_are_recomputed(name):
    """To six digits: the sums of moments at the arc fall off slowly."""
    record = RECORDS[name]
    x, y = np.array([quantity["at"] for quantity in record["quantities"]]).T
    opening, support = np.pi / float(name.split("_")[1]), record["supports"]["arc"]
    w, radial, hoop = oracles_rings.sector_bisector(
        np.hypot(x, y), opening, support, pressure=-1.0
    )
    for k, quantity in enumerate(record["quantities"]):
        found = w[k]
        if quantity["quantity"] == "moment":
            along = np.array(quantity["normal"]) @ [x[k], y[k]]
            found = radial[k] if along > 1e-9 else hoop[k]
        assert found == pytest.approx(quantity["value"], rel=2e-6), quantity


def test_the_clamped_ellipse_is_recomputed():
    record = RECORDS["ellipse_C_2.0"]
    at, nu = [quantity["at"] for quantity in record["quantities"]], record["nu"]
    w, w_xx, w_yy = oracles_rings.clamped_ellipse(at, (2.0, 1.0), pressure=-1.0)
    found = {"deflection": w, "m_xx": w_xx + nu * w_yy, "m_yy": w_yy + nu * w_xx}
    for k, quantity in enumerate(record["quantities"]):
        value = found[quantity["quantity"]][k]
        assert value == pytest.approx(quantity["value"], rel=1e-9), quantity


@pytest.mark.parametrize(
    "name", ["uni_nu0.3", "uni_nu0.0", "twist_nu0.3", "twist_nu0.0"]
)
def test_holes_in_bending_keep_to_goodier(name):
    """J. N. Goodier, Phil. Mag. 22 (1936) (from memory): (5 + 3 nu) / (3 + nu)."""
    record = RECORDS[f"holebend_{name}"]
    nu, first = record["nu"], record["quantities"][0]["value"]
    stretched = (5 + 3 * nu) / (3 + nu)
    twisted = 4 * (1 + nu) / (3 + nu)
    assert first == pytest.approx(twisted if "twist" in name else stretched, rel=1e-9)
    if "uni" in name:  # m_xx alone and m_yy alone, together even bending: 2
        other = record["quantities"][1]["value"]
        assert first + other == pytest.approx(2.0, rel=1e-9)
        # from bending minus bending turned by a right angle comes twist
        assert first - other == pytest.approx(twisted, rel=1e-9)


def test_the_sine_load_is_recomputed():
    record, k = RECORDS["ssss_sin"], np.pi
    w0, nu = -1.0 / (4 * k**4), record["nu"]
    values = {"deflection": w0, "m_xx": -w0 * k**2 * (1 + nu)}
    values["corner force"] = 2 * (1 - nu) * w0 * k**2
    values["line reaction"] = -w0 * k**3 * (2 + (1 - nu))
    for own in record["quantities"]:
        assert values[own["quantity"]] == pytest.approx(own["value"], rel=1e-9), own


@pytest.mark.parametrize("name", ["sffs_u_1", "scfs_u_1"])
def test_squares_in_files_of_their_own_are_recomputed(name):
    """By Ritz with up to 26 polynomials a direction; the rest is extrapolated."""
    record = records.record(name)
    own = [q for q in record["quantities"] if "Ritz" in q["method"]]
    places, sides = np.array([q["at"] for q in own]), tuple(side_words(record))
    values = []
    for n in (18, 22, 26):
        w, m = ritz_square(places, sides, n, nu=record["nu"])
        values.append([-w[k] if q["quantity"] == "deflection" else -m[k, 0]
                       for k, q in enumerate(own)])  # fmt: skip
    first, second, last = np.array(values)
    for k, quantity in enumerate(own):
        error = abs(last[k] / quantity["value"] - 1.0)
        step = abs(last[k] - second[k]) / abs(last[k])
        assert error <= max(3.0 * step, 10.0 ** (1 - quantity["digits"])), quantity
        assert abs(last[k] - second[k]) < abs(second[k] - first[k])
        if quantity["quantity"] == "deflection":
            assert abs(last[k]) <= abs(quantity["value"]) * (1.0 + 1e-8)


def test_more_than_half_of_the_records_are_recomputed():
    assert len(SOLVED + ROUND) == 58
    assert len(STRIPED) == 7
    assert len(RINGS) == 15
    assert len(SECTORS) == 5
    assert len(RECORDS) == len(REFERENCE["records"]) >= 60
    assert sum(len(record["quantities"]) for record in RECORDS.values()) >= 60


@pytest.mark.parametrize("name", RECORDS)
def test_records_are_well_formed(name):
    record = RECORDS[name]
    outline = record["outline"]
    if "polygon" in outline:
        assert len(outline["sides"]) == len(outline["polygon"])
        assert len(outline.get("bulges", [])) in (0, len(outline["polygon"]))
        sides = list(dict.fromkeys(outline["sides"]))
        x, y = np.array(outline["polygon"]).T
        assert np.sum(x * np.roll(y, -1) - y * np.roll(x, -1)) > 0.0  # anticlockwise
    else:
        sides = [(outline.get("circle") or outline["ellipse"])["side"]]
    sides += [hole["circle"]["name"] for hole in record["holes"]]
    sides += [own["name"] for key in INSIDE for own in record.get(key, [])]
    assert len(set(sides)) == len(sides)
    assert set(record["supports"]) <= set(sides)
    words = {"clamped", "simply supported", "guided"}
    assert set(record["supports"].values()) <= words
    assert record["supports"]
    kinds = {"uniform": {"pressure"}, "linear": {"at_origin", "gradient"}}
    kinds |= {"patch": {"centre", "size", "force"}, "point": {"at", "force"}}
    kinds |= {"line": {"along", "force"}, "edge moment": {"along", "moment"}}
    kinds |= {"sine": {"pressure", "size"}, "several": {"loads"}}
    kinds["disc patch"] = {"centre", "radius", "force"}
    assert set(record["load"]) - {"kind", "zone"} == kinds[record["load"]["kind"]]
    assert 0.0 <= record["nu"] < 0.5
    low, high = np.min(vertices(record), 0), np.max(vertices(record), 0)
    for quantity in record["quantities"]:
        assert quantity["quantity"] in records.QUANTITIES
        assert quantity["coefficient"]
        assert quantity["place"]
        assert quantity["source"] in REFERENCE["sources"]
        assert 6 <= quantity["digits"] <= 10
        if "bulges" not in outline:
            assert (low - 1e-12 <= quantity["at"]).all()
            assert (quantity["at"] <= high + 1e-12).all()
        across = quantity["quantity"] in ("moment", "shear")
        assert ("normal" in quantity) == across
        assert np.hypot(*quantity.get("toward", [1.0, 0.0])) == 1.0
        if quantity["published"] is not None:
            # the worst, TW table 47, is 16 % off; this is here for the signs
            close = {"rel": 0.17, "abs": 6e-5}
            assert quantity["published"] == pytest.approx(quantity["value"], **close)
            assert quantity["publication"]


def test_loads_down_deflect_down_and_corners_are_held_down():
    """The signs of the conversion, where the physics leaves no doubt."""
    for record in RECORDS.values():
        supported = set(side_words(record)) if "polygon" in record["outline"] else set()
        for quantity in record["quantities"]:
            if quantity["quantity"] == "deflection" and pressed_down(record):
                lifted = in_the_unloaded_span(record, quantity["at"])
                assert (quantity["value"] > 0.0) == lifted
            if quantity["quantity"] == "corner force":
                assert quantity["value"] < 0.0
            pushed = quantity["quantity"] in {"line reaction", "point reaction"}
            if pushed and record["id"] != "pure_twist":
                assert quantity["value"] > 0.0
            straight = "bulges" not in record["outline"]
            if (
                supported == {"clamped"}
                and straight
                and on_a_side(record, quantity["at"])
            ):
                moment = quantity["quantity"] in {"m_xx", "m_yy", "moment"}
                assert not moment or quantity["value"] < 0.0


def pressed_down(record: dict) -> bool:
    """Whether loads act down, or bend the plate down everywhere."""
    return record["id"] not in ("ann_0.3_iF_oS_innerM", "pure_bend")


def in_the_unloaded_span(record: dict, at: list[float]) -> bool:
    """Whether a place lies beyond the one zone that is loaded."""
    name = record["load"].get("zone")
    zones = [own["polygon"] for own in record.get("zones", []) if own["name"] == name]
    return any(at[1] > np.max(polygon, axis=0)[1] for polygon in zones)


def on_a_side(record: dict, at: list[float]) -> bool:
    """Whether a place lies on the polygon."""
    start = vertices(record)
    along = np.roll(start, -1, axis=0) - start
    offset = np.array(at) - start
    across = along[:, 0] * offset[:, 1] - along[:, 1] * offset[:, 0]
    return bool(np.any(np.abs(across) < 1e-12 * np.sum(along**2, axis=1)))


@pytest.mark.parametrize("angle", [30, 45, 60, 75])
def test_principal_moments_of_the_skew_plates_follow_from_their_components(angle):
    record = RECORDS[f"rhomb_s_u_{angle}"]
    found = {q["quantity"]: q["value"] for q in record["quantities"]}
    m_xx, m_yy, m_xy = (found[name] for name in ("m_xx", "m_yy", "m_xy"))
    m_2, m_1 = np.linalg.eigvalsh([[m_xx, m_xy], [m_xy, m_yy]])
    assert [m_1, m_2] == pytest.approx([found["m_1"], found["m_2"]], rel=1e-9)
