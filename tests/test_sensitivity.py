"""Derivatives by adjoint solves against differences of plates solved anew."""

from dataclasses import replace
from functools import cache

import numpy as np
import plates
import pytest

from kplate.adapt import solve
from kplate.errors import InputError
from kplate.functionals import settled_vertices
from kplate.loads import (
    Case,
    EdgeMoment,
    PointForce,
    Pressure,
    RectanglePatch,
    SelfWeight,
)
from kplate.materials import ALUMINIUM, STEEL
from kplate.outline import Outline
from kplate.plate import Plate, Section
from kplate.sensitivity import COMPONENTS, sensitivities
from kplate.shapes import Rectangle
from kplate.solution import Solution
from kplate.solve.static import solve_static
from kplate.supports import SIMPLY_SUPPORTED

STEP = 1e-4  # of central differences, as a share: their own error is about 1e-8
CASES = (
    Case(
        name="wheel",
        loads=[
            RectanglePatch(force=-900.0, centre=(0.55, 0.35), size=(0.2, 0.1)),
            PointForce(force=-40.0, at=(1.0, 0.8)),
            SelfWeight(),
        ],
    ),
    Case(name="lift", loads=[Pressure(500.0), EdgeMoment(moment=30.0, along="east")]),
)
ALL = ("deflection", "von Mises", "largest principal", "smallest principal", "m_xy")


def stepped(*, zone_of_its_own=True):
    """A simply supported plate with a stiff pad and a part of aluminium."""
    outline = Outline.polygon(
        [(0, 0), (1.0, 0), (1.0, 0.8), (0, 0.8)], sides=plates.SIDES
    )
    outline = outline.zone(
        Rectangle(centre=(0.3, 0.5), size=(0.3, 0.3), name="pad"), name="pad"
    ).zone(Rectangle(centre=(0.75, 0.3), size=(0.3, 0.2), name="soft"), name="soft")
    pad = Section(thickness=0.014 if zone_of_its_own else None)
    return Plate(
        outline=outline,
        thickness=0.008,
        material=STEEL,
        supports=dict.fromkeys(plates.SIDES, SIMPLY_SUPPORTED),
        zones={"pad": pad, "soft": Section(material=ALUMINIUM)},
    )


@cache
def solved():
    """On a mesh of zones; the derivatives hold for elements of any kind."""
    mesh = solve(stepped(), CASES, triangles=100, element="dkt").mesh
    return Solution(state=solve_static(stepped(), mesh, CASES, element="quintic"))


def changed(plate, cases, parameter, factor):
    """The same with one parameter times a factor."""

    def stiffer(material):
        alike = parameter.kind == "modulus" and material.name == parameter.of
        return replace(material, E=material.E * (factor if alike else 1.0))

    zones = {}
    for name, section in plate.zones.items():
        h = section.thickness
        if parameter.kind == "thickness" and parameter.of == name:
            h *= factor
        material = section.material and stiffer(section.material)
        zones[name] = Section(thickness=h, material=material)
    base = parameter.kind == "thickness" and not parameter.of
    new = replace(
        plate,
        thickness=plate.thickness * (factor if base else 1.0),
        material=stiffer(plate.material),
        zones=zones,
    )
    if parameter.kind == "load":
        cases = [
            replace(
                case,
                loads=[
                    times(load, factor)
                    if (case.name, i) == (parameter.of, parameter.number)
                    else load
                    for i, load in enumerate(case.loads)
                ],
            )
            for case in cases
        ]
    return new, cases


def times(load, factor):
    field = {"Pressure": "value", "SelfWeight": "acceleration", "EdgeMoment": "moment"}
    name = field.get(type(load).__name__, "force")
    return replace(load, **{name: getattr(load, name) * factor})


def reading(solution, found):
    """The number of a sensitivity, at its place, of another solution."""
    case, value = found.value.case, found.value
    if found.quantity == "peak deflection":
        return solution.deflection([value.place], case=case)[0]
    if found.quantity == "corner hold-down":
        corner = next(
            own
            for own in solution.reactions(case=case).corners
            if own.corner.place == value.place
        )
        return -corner.force.value
    if found.quantity.startswith("force of "):
        vertices, _ = settled_vertices(solution.mesh, found.quantity[9:])
        own = solution.state.constraints.numbering.at_vertices(vertices)[:, 0]
        return solution.state.support_forces[own, solution.cases.index(case)].sum()
    quantity = found.quantity.removeprefix("peak ")
    if quantity in COMPONENTS:
        own = solution.moments([value.place], case=case)
        return own[0, COMPONENTS.index(quantity)]
    face = value.face
    if quantity == "von Mises":
        return solution.von_mises([value.place], face=face, case=case)[0]
    xx, yy, xy = solution.stresses([value.place], face=face, case=case)[0]
    sign = 1.0 if quantity == "largest principal" else -1.0
    return 0.5 * (xx + yy) + sign * np.hypot(0.5 * (xx - yy), xy)


def compare(solution, every, element):
    """Hold derivatives against central differences; yield those that could be held."""
    anew, scale = {}, {}
    for found in every:
        key = (found.quantity, found.value.case)
        own = abs(found.derivative * found.parameter.value)
        scale[key] = max(scale.get(key, 0.0), own)
        for factor in (1.0 - STEP, 1.0 + STEP):
            if (found.parameter, factor) not in anew:
                plate, cases = changed(
                    solution.plate, solution.state.cases, found.parameter, factor
                )
                state = solve_static(plate, solution.mesh, cases, element=element)
                anew[found.parameter, factor] = Solution(state=state)
    for found in every:
        if reading(solution, found) != pytest.approx(found.value.value, rel=1e-9):
            continue  # on an edge, where another triangle is read
        low, high = (
            reading(anew[found.parameter, 1.0 + sign * STEP], found) for sign in (-1, 1)
        )
        expected = (high - low) / (2.0 * STEP * found.parameter.value)
        size = scale[found.quantity, found.value.case] / found.parameter.value
        assert found.derivative == pytest.approx(expected, rel=1e-5, abs=1e-7 * size), (
            found.quantity,
            found.parameter,
        )
        yield found


@pytest.mark.slow
def test_derivatives_meet_differences_with_zones():
    """Thickness of plate and pad, E of two materials, every load."""
    every = sensitivities(solved(), supports=("south",))
    met = list(compare(solved(), every, "quintic"))
    kinds = {(found.quantity, found.parameter.kind) for found in met}
    for quantity in ("peak deflection", "corner hold-down", "force of south"):
        for kind in ("thickness", "modulus", "load"):
            assert (quantity, kind) in kinds
    assert {found.parameter.of for found in met} >= {
        "",
        "pad",
        STEEL.name,
        ALUMINIUM.name,
        "wheel",
        "lift",
    }
    assert len({found.quantity for found in met}) == 4


@pytest.mark.parametrize("element", ["quintic", "hct"])
def test_derivatives_meet_differences_on_one_thickness(element):
    plate = plates.rectangle(SIMPLY_SUPPORTED, a=1.0, b=0.8)
    plate = replace(plate, material=STEEL)
    state = solve_static(plate, plates.grid(5, b=0.8, m=4), CASES, element=element)
    solution = Solution(state=state)
    every = sensitivities(solution, quantities=ALL, supports=("west",))
    assert len(list(compare(solution, every, element))) > 20


def test_powers_of_thickness_and_modulus_under_given_loads():
    """w goes with 1/(E h^3), stress with 1/h^2, hold-down with neither."""  # noqa: D403
    plate = replace(plates.rectangle(SIMPLY_SUPPORTED), material=STEEL)
    state = solve_static(
        plate,
        plates.grid(6),
        [Case(name="p", loads=[Pressure(-1e3)])],
        element="quintic",
    )
    every = sensitivities(Solution(state=state), supports=("south",))
    found = {(s.quantity, s.parameter.kind): s.relative for s in every}
    powers = {
        "peak deflection": (-3.0, -1.0, 1.0),
        "peak von Mises": (-2.0, 0.0, 1.0),
        "corner hold-down": (0.0, 0.0, 1.0),
        "force of south": (0.0, 0.0, 1.0),
    }
    for quantity, expected in powers.items():
        for kind, power in zip(("thickness", "modulus", "load"), expected, strict=True):
            assert found[quantity, kind] == pytest.approx(power, abs=1e-9), quantity


def test_what_cannot_be_differentiated_is_refused():
    solution = solved()
    with pytest.raises(InputError, match="a peak of shear stress is not differentiat"):
        sensitivities(solution, quantities=("shear stress",))
    with pytest.raises(InputError) as caught:
        sensitivities(solution, supports=("nroth",))
    assert str(caught.value) == (
        "there is no support 'nroth' that holds the deflection; they are south, east, "
        "north, west."
    )
    flat = Solution(state=solve_static(stepped(), solution.mesh, CASES, element="dkt"))
    with pytest.raises(InputError, match="has no moments of its own"):
        sensitivities(flat)
