"""Numbers and quantities as they stand in a panel file, read into SI units.

A quantity is text, a number and a unit: ``"10 mm"``, ``"3/8 in"``, ``"5 kN/m^2"``. The
number is read here and only the unit goes to pint, which would take "1,5 mm" for 15 mm
and "1 1/2 in" for half an inch. A load adds the word up or down and has no sign.
"""

import math
import re
from functools import cache, lru_cache
from typing import Any

from kplate.errors import InputError
from kplate.units import Unit

# What a file may measure: the SI unit, and how it is written in a file.
DIMENSIONS = {
    "length": ("m", '"10 mm"'),
    "area": ("m**2", '"1.02 m^2"'),
    "force": ("N", '"1.5 kN"'),
    "line force": ("N/m", '"2 kN/m"'),
    "moment": ("N*m", '"50 N m"'),
    "line moment": ("N", '"100 N m/m"'),
    "pressure": ("Pa", '"5 kPa"'),
    "stress": ("Pa", '"235 MPa"'),
    "density": ("kg/m**3", '"7850 kg/m^3"'),
    "acceleration": ("m/s**2", '"9.81 m/s^2"'),
}
# Only their units may have a space for a product: "N m/m".
SPACED = ("moment", "line moment")
# No quantity of a panel lies outside, in SI units; squares and cubes stay finite.
REACH = (1e-12, 1e15)
# Units that are nearly always a slip of the shift key.
SLIPS = {"mPa": "MPa", "Mm": "mm"}
MOST_TEXT = 100  # characters of a name or a quantity: it has to fit a table

_NUMBER = r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_FRACTION = r"[+-]?(?:[0-9]+ +)?[0-9]+ ?/ ?[1-9][0-9]*"
_FACTOR = r"[A-Za-zµμ]{1,32}(?:(?:\^|\*\*)?[1-4]|[²³])?"
_UNIT = rf"{_FACTOR}(?: ?[/*·] ?{_FACTOR}){{0,3}}"
_SPACED_UNIT = rf"{_FACTOR}(?:(?: ?[/*·] ?| ){_FACTOR}){{0,3}}"
_QUANTITY = re.compile(rf"({_FRACTION}|{_NUMBER})(?:\s*({_SPACED_UNIT}))?")


def quantity(text: object, dimension: str) -> float:
    """Read a number with its unit.

    Parameters
    ----------
    text : object
        What stands in the file, such as ``"10 mm"``.
    dimension : str
        What it must measure, a key of `DIMENSIONS`.

    Returns
    -------
    float
        The quantity in SI units, with its sign.

    Raises
    ------
    InputError
        If it is not text, has no unit, or measures something else.

    Examples
    --------
    >>> quantity("10 mm", "length")
    0.01
    """
    number, its_unit = _split(text, dimension)
    value = number * its_unit.size
    check_reach(value, dimension)
    return value


def length(value: object, plain: Unit) -> float:
    """Read a length or coordinate in m, with its sign.

    Parameters
    ----------
    value : object
        Text with a unit, or a number without one.
    plain : Unit
        What the number without one counts in.

    Raises
    ------
    InputError
        If it is neither, or too large.
    """
    if isinstance(value, str):
        return quantity(value, "length")
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise InputError(
            "a length is a number in the outline's unit, or text with a unit of its "
            f"own, such as {DIMENSIONS['length'][1]}."
        )
    size = bare_number(value) * plain.size
    check_reach(max(abs(size), 1.0), "length")  # a tiny one is 0 but for round-off
    return size


def two_lengths(text: str) -> tuple[float, float] | None:
    """Read ``"200 mm x 100 mm"`` in m; ``None`` where it is not of two parts."""
    parts = re.split("[x\u00d7]", text)
    if len(parts) != 2:
        return None
    return positive(parts[0], "length"), positive(parts[1], "length")


def stated_unit(text: object, dimension: str) -> Unit:
    """Read the unit of a quantity; see `quantity`."""
    return _split(text, dimension)[1]


def positive(text: object, dimension: str) -> float:
    """Read a quantity that must be larger than zero; see `quantity`."""
    value = quantity(text, dimension)
    if value <= 0.0:
        raise InputError(f"it must be a positive {dimension}.")
    return value


def directed(text: object, dimension: str) -> float:
    """Read a load such as ``"5 kPa down"``; the SI value is positive up."""
    example = DIMENSIONS[dimension][1].strip('"')
    amount, _, word = (
        text.strip().rpartition(" ") if isinstance(text, str) else [""] * 3
    )
    if word not in ("up", "down"):
        raise InputError(f'a load says up or down in words, such as "{example} down".')
    if amount.startswith(("-", "+")):
        raise InputError(f"up or down says it all; take the sign {amount[0]!r} out.")
    value = positive(amount, dimension)
    return value if word == "up" else -value


def angle(text: object) -> float:
    """Read an angle such as ``"30 deg"``, in rad."""
    sizes = {"deg": math.pi / 180.0, "°": math.pi / 180.0, "rad": 1.0}
    match = (
        re.fullmatch(rf"({_NUMBER})\s*({'|'.join(sizes)})", text.strip())
        if isinstance(text, str) and len(text) <= MOST_TEXT
        else None
    )
    if match is None:
        raise InputError('an angle is a number in deg or rad, such as "30 deg".')
    value = _number(match[1]) * sizes[match[2]]
    if abs(value) > 2.0 * math.pi:
        raise InputError("it turns by more than a full circle.")
    return value


def share(text: object) -> float:
    """Read a share such as ``"1 %"``, as a number between 0 and 1, exclusive."""
    per_cent = _per_cent(text)
    if per_cent is None or not 0.0 < per_cent < 100.0:
        raise InputError('it must be a share between 0 and 100 %, such as "1 %".')
    return per_cent / 100.0


def fraction(text: object) -> float:
    """Read a part of a whole such as ``"40 %"``, as a number from 0 to 1."""
    per_cent = _per_cent(text)
    if per_cent is None or not 0.0 <= per_cent <= 100.0:
        raise InputError('it must be a share from 0 % to 100 %, such as "40 %".')
    return per_cent / 100.0


@lru_cache(maxsize=256)
def unit(text: str, dimension: str) -> Unit:
    """Read a unit, such as ``"mm"``; its symbol stays as written.

    Parameters
    ----------
    text : str
        The unit.
    dimension : str
        What it must measure, a key of `DIMENSIONS`.

    Raises
    ------
    InputError
        If there is no such unit, or it measures something else.
    """
    si, example = DIMENSIONS[dimension]
    pattern = _SPACED_UNIT if dimension in SPACED else _UNIT
    if len(text) > MOST_TEXT or not re.fullmatch(pattern, text):
        raise InputError(f"{text!r} is no unit; write one such as {si}.")
    if text in SLIPS:
        raise InputError(
            f"unit {text!r} is a slip of the pen; did you mean {SLIPS[text]}?"
        )
    ascii_text = text.replace("²", "^2").replace("³", "^3").replace("·", "*")
    ascii_text = re.sub(r"(?<=[A-Za-zµμ])(?=[1-4])", "^", ascii_text)
    ascii_text = re.sub(r"(?<=[^/* ]) (?=[^/* ])", "*", ascii_text)
    pint = _registry()
    try:
        found = pint.parse_units(ascii_text)
        fits = found.dimensionality == pint.parse_units(si).dimensionality
        size = float(pint.Quantity(1.0, found).to(si).magnitude) if fits else 0.0
    except Exception as error:  # pint parses as Python does and raises what that raises
        raise InputError(
            f"there is no unit {text!r}; write {dimension} such as {example}."
        ) from error
    if not size > 0.0:
        raise InputError(
            f"{text!r} is no unit of {dimension}; write it such as {example}."
        )
    return Unit(text, size)


def check_reach(value: float, dimension: str) -> None:
    """Refuse a number that no panel can have."""
    if value != 0.0 and not REACH[0] <= abs(value) <= REACH[1]:
        size = "large" if abs(value) > 1.0 else "small"
        raise InputError(f"the {dimension} is too {size} for any panel.")


def bare_number(value: object) -> float:
    """Check a number that stands without a unit."""
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise InputError("it must be a number, without quotes and unit.")
    if not abs(value) <= REACH[1]:
        raise InputError("it must be a finite number of a usual size.")
    return float(value)


def _split(text: object, dimension: str) -> tuple[float, Unit]:
    """Part a quantity into its number and its unit."""
    example = DIMENSIONS[dimension][1]
    name = f"an {dimension}" if dimension[0] in "aeiou" else f"a {dimension}"
    if not isinstance(text, str):
        raise InputError(f"{name} is text with its unit, such as {example}.")
    if "," in text:
        raise InputError("write a decimal point and no commas, such as 1.5.")
    match = _QUANTITY.fullmatch(text.strip()) if len(text) <= MOST_TEXT else None
    if match is None:
        raise InputError(f"{name} is a number and its unit, such as {example}.")
    number, unit_text = match.groups()
    if unit_text is None:
        raise InputError(f"{name} needs a unit, such as {example}.")
    return _number(number), unit(unit_text, dimension)


def _per_cent(text: object) -> float | None:
    """Read the number of a text such as ``"1 %"``; ``None`` for anything else."""
    match = (
        re.fullmatch(rf"({_NUMBER})\s*%", text.strip())
        if isinstance(text, str) and len(text) <= MOST_TEXT
        else None
    )
    return None if match is None else _number(match[1])


def _number(text: str) -> float:
    """Value of a number, a fraction, or a whole number and a fraction."""
    top, slash, bottom = text.partition("/")
    if not slash:
        return float(text)
    whole, _, over = top.strip().rpartition(" ")
    size = abs(int(whole or 0)) + abs(int(over)) / int(bottom)
    return -size if text.startswith("-") else size


@cache
def _registry() -> Any:
    """Pint's units, and two of American practice that it lacks."""
    import pint

    registry: Any = pint.UnitRegistry()
    registry.define("pound_per_square_foot = pound_force / foot ** 2 = psf")
    registry.define("pound_per_cubic_foot = pound / foot ** 3 = pcf")
    return registry
