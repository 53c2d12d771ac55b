"""Quantities of a panel file: exact in SI, and nothing strange gets through."""

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kplate.errors import InputError
from kplate.quantities import (
    angle,
    fraction,
    length,
    quantity,
    share,
    two_lengths,
    unit,
)
from kplate.units import Unit


# Conversion factors: the inch and the pound are exact by the international agreement of
# 1959, 25.4 mm and 0.45359237 kg; the pound-force is the pound times 9.80665 m/s2.
@pytest.mark.parametrize(
    ("text", "dimension", "value"),
    [
        ("10mm", "length", 0.01),
        ("-1.5e2 cm", "length", -1.5),
        ("3/8 in", "length", 0.375 * 0.0254),
        ("1 1/2 in", "length", 1.5 * 0.0254),
        ("-1 1/2 ft", "length", -1.5 * 0.3048),
        ("1 lbf", "force", 0.45359237 * 9.80665),
        ("2 kip", "force", 2000 * 0.45359237 * 9.80665),
        ("5 kN/m2", "pressure", 5e3),
        ("5 N/mm²", "stress", 5e6),
        ("1 psi", "pressure", 0.45359237 * 9.80665 / 0.0254**2),
        ("100 psf", "pressure", 100 * 0.45359237 * 9.80665 / 0.3048**2),
        ("62.4 pcf", "density", 62.4 * 0.45359237 / 0.3048**3),
        ("7.85 g/cm^3", "density", 7850.0),
        ("1.02 m2", "area", 1.02),
        ("2 ft^2", "area", 2 * 0.3048**2),
        ("2 kN/m", "line force", 2e3),
        ("10 lbf/in", "line force", 10 * 0.45359237 * 9.80665 / 0.0254),
        ("50 N m", "moment", 50.0),
        ("50 N*m", "moment", 50.0),
        ("2 kip ft", "moment", 2000 * 0.45359237 * 9.80665 * 0.3048),
        ("100 N m/m", "line moment", 100.0),
        ("1.5 kN m / m", "line moment", 1500.0),
        ("100 N", "line moment", 100.0),
    ],
)
def test_quantities_in_si(text, dimension, value):
    assert quantity(text, dimension) == pytest.approx(value, rel=1e-12)


def test_shares_and_angles():
    assert fraction("0 %") == 0.0
    assert fraction("100%") == 1.0
    assert share("2.5 %") == pytest.approx(0.025, rel=1e-12)
    assert angle("90 deg") == angle("90°") == pytest.approx(math.pi / 2, rel=1e-12)
    assert angle("-0.5 rad") == -0.5


@pytest.mark.parametrize("text", ["100.1 %", "-1 %", "0.4", 40, "nan %", None])
def test_no_other_fraction_gets_through(text):
    with pytest.raises(InputError, match="a share from 0 % to 100 %"):
        fraction(text)


def test_lengths_with_and_without_a_unit():
    inch = Unit("in", 0.0254)
    assert length(2, inch) == pytest.approx(0.0508, rel=1e-12)
    assert length(-2.5, inch) == pytest.approx(-0.0635, rel=1e-12)
    assert length("2 mm", inch) == 0.002
    assert two_lengths("200 mm x 1/2 in") == pytest.approx((0.2, 0.0127), rel=1e-12)
    assert two_lengths("200 mm") is two_lengths("1 m x 2 m x 3 m") is None
    for wrong in (True, None, [1], float("nan"), 1e300):
        with pytest.raises(InputError):
            length(wrong, inch)


@pytest.mark.parametrize("text", ["10 mm deg", "10 mm m/m", "N m", "mm rad"])
def test_only_moments_have_spaces_in_their_units(text):
    with pytest.raises(InputError, match=r"a length is|is no unit|no unit"):
        quantity(text, "length")


@pytest.mark.parametrize(
    "text", ["dBm s/m", "degC m/K", "m" * 99, "m^9", "(m)", "", "1"]
)
def test_no_strange_unit_gets_through(text):
    for dimension in ("length", "force"):
        with pytest.raises(InputError, match="unit"):
            unit(text, dimension)


PIECES = [
    "1",
    "-",
    ".",
    "0",
    "5e9",
    "e",
    "/",
    " ",
    "mm",
    "m",
    "k",
    "g",
    "kg/m^3",
    "^",
    "**",
]
PIECES += [
    "²",
    "µm",
    "in",
    "psf",
    "degC",
    "dB",
    "_",
    "(",
    "nan",
    "inf",
    "1/2",
    "2",
    "%",
]


@settings(max_examples=500, derandomize=True, deadline=None)
@given(
    text=st.lists(st.sampled_from(PIECES), max_size=6).map("".join),
    dimension=st.sampled_from(["length", "density", "moment", "line moment"]),
)
def test_any_text_is_a_finite_quantity_or_refused(text, dimension):
    try:
        value = quantity(text, dimension)
    except InputError:
        return
    assert math.isfinite(value)
