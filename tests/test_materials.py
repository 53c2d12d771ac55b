"""Rigidities against the mechanics they stand for; what is refused; the stock."""

import math
import re

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from kplate.errors import InputError, KplateWarning
from kplate.materials import GLASS, STEEL, STOCK, Isotropic

ratios = st.floats(0.0, 0.5)
moduli = st.floats(0.1e9, 1000e9)
thicknesses = st.floats(1e-4, 1.0)


def material(**changes):
    numbers = {"name": "test", "E": 70e9, "nu": 0.3} | changes
    return Isotropic(**numbers)


def test_bending_stiffness_of_ten_millimetres_of_steel():
    """``210e9 0.01^3 / (12 (1 - 0.09)) = 210000 / 10.92``."""
    assert STEEL.bending_stiffness(0.01) == pytest.approx(19230.769230769, rel=1e-12)


@given(moduli, ratios, thicknesses)
def test_a_strip_bends_like_a_beam(E, nu, h):
    """Free to curve across, ``w,yy = -nu w,xx``, its moment is ``E h^3/12 w,xx``."""
    moments = material(E=E, nu=nu).rigidity(h) @ [1.0, -nu, 0.0]
    beam = E * h**3 / 12.0
    np.testing.assert_allclose(moments, [beam, 0.0, 0.0], rtol=1e-12, atol=1e-12 * beam)


@given(moduli, ratios, thicknesses)
def test_twist_takes_the_shear_modulus(E, nu, h):
    """``m_xy = G h^3/6 w,xy``, the curvature being ``2 w,xy``."""
    G = E / (2.0 * (1.0 + nu))
    moments = material(E=E, nu=nu).rigidity(h) @ [0.0, 0.0, 2.0]
    np.testing.assert_allclose(moments, [0.0, 0.0, G * h**3 / 6.0], rtol=1e-12)


@given(ratios, st.floats(0.0, math.pi))
def test_rigidity_is_the_same_in_every_direction(nu, turn):
    c, s = math.cos(turn), math.sin(turn)
    bend = np.array(
        [
            [c * c, s * s, -c * s],
            [s * s, c * c, c * s],
            [2 * c * s, -2 * c * s, c * c - s * s],
        ]
    )
    D = material(nu=nu).rigidity(0.01)
    np.testing.assert_allclose(bend.T @ D @ bend, D, rtol=0.0, atol=1e-12 * D.max())
    assert np.linalg.eigvalsh(D)[0] > 0.0


MODULUS = "Young's modulus must be a positive number."
RATIO = "Poisson's ratio must lie between 0 and 0.5."
DENSITY = "it must be a positive number."


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"E": 0.0}, f"E = 0 Pa; {MODULUS}"),
        ({"E": -70e9}, f"E = -7e+10 Pa; {MODULUS}"),
        ({"E": math.inf}, f"E = inf Pa; {MODULUS}"),
        ({"E": math.nan}, f"E = nan Pa; {MODULUS}"),
        ({"nu": -0.01}, f"nu = -0.01; {RATIO}"),
        ({"nu": 0.51}, f"nu = 0.51; {RATIO}"),
        ({"nu": math.nan}, f"nu = nan; {RATIO}"),
        ({"density": 0.0}, f"density = 0 kg/m3; {DENSITY}"),
        ({"density": -1.5}, f"density = -1.5 kg/m3; {DENSITY}"),
        ({"density": math.inf}, f"density = inf kg/m3; {DENSITY}"),
        ({"density": math.nan}, f"density = nan kg/m3; {DENSITY}"),
    ],
)
def test_impossible_numbers_are_refused(changes, message):
    with pytest.raises(InputError, match=f"^material 'test': {re.escape(message)}$"):
        material(**changes)


@pytest.mark.parametrize(
    ("E", "shown"), [(210.0, "210"), (0.09e9, "9e+07"), (210e12, "2.1e+14")]
)
def test_a_modulus_in_the_wrong_unit_draws_a_warning(E, shown):
    message = (
        f"material 'test': E = {shown} Pa is outside 0.1 to 1000 GPa; check its unit."
    )
    with pytest.warns(KplateWarning, match=f"^{re.escape(message)}$") as caught:
        Isotropic(name="test", E=E, nu=0.3)
    assert [warning.filename for warning in caught] == [__file__]


@pytest.mark.parametrize("E", [0.1e9, 1000e9])
@pytest.mark.parametrize("nu", [0.0, 0.5])
def test_the_ends_of_the_usual_ranges_are_allowed(E, nu):
    assert material(E=E, nu=nu, density=1e-3).E == E


# EN 1993-1-1 3.2.6 and EN 1993-1-4 (steel), EN 1999-1-1 3.2.5 (aluminium), EN 572-1
# (glass); all from memory. Poisson's ratio of glass: 0.23, common practice.
@pytest.mark.parametrize(
    ("name", "E", "nu", "density"),
    [
        ("steel S235", 210e9, 0.3, 7850.0),
        ("steel S275", 210e9, 0.3, 7850.0),
        ("steel S355", 210e9, 0.3, 7850.0),
        ("stainless 1.4301", 200e9, 0.3, 7900.0),
        ("aluminium 5083", 70e9, 0.3, 2660.0),
        ("float glass", 70e9, 0.23, 2500.0),
    ],
)
def test_stock_has_the_numbers_of_the_standards(name, E, nu, density):
    found = STOCK[name]
    assert (found.name, found.E, found.nu, found.density) == (name, E, nu, density)
    assert found.source


def test_stock_holds_what_can_be_imported():
    assert STOCK["steel S235"] is STEEL
    assert STOCK["float glass"] is GLASS
    assert len(STOCK) == 6
