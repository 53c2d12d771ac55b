"""Quantities of a panel file: exact in SI, and nothing strange gets through."""

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kplate.errors import InputError
from kplate.quantities import angle, quantity, share, unit


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
    ],
)
def test_quantities_in_si(text, dimension, value):
    assert quantity(text, dimension) == pytest.approx(value, rel=1e-12)


def test_shares_and_angles():
    assert share("2.5 %") == pytest.approx(0.025, rel=1e-12)
    assert angle("90 deg") == angle("90°") == pytest.approx(math.pi / 2, rel=1e-12)
    assert angle("-0.5 rad") == -0.5


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
    dimension=st.sampled_from(["length", "density"]),
)
def test_any_text_is_a_finite_quantity_or_refused(text, dimension):
    try:
        value = quantity(text, dimension)
    except InputError:
        return
    assert math.isfinite(value)
