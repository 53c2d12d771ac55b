"""What a user gives, copied into plain numbers, or refused in words."""

import contextlib
import reprlib
from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from kplate.arrays import Floats, read_only_floats
from kplate.errors import InputError

# Nobody draws a plate farther from its origin; beyond, products of lengths overflow.
FARTHEST = 1e9  # m


def as_points(points: ArrayLike, what: str = "the points of a polygon") -> Floats:
    """Copy what a user gives for points, or say in words what it is."""
    with contextlib.suppress(TypeError, ValueError, OverflowError):
        if np.asarray(points).dtype.kind in "iufO":  # no text, no complex numbers
            return read_only_floats(points)
    raise InputError(
        f"{what} are {reprlib.repr(points)}; give pairs (x, y) of numbers in m."
    )


def as_bulges(bulges: ArrayLike, n: int) -> Floats:
    """Copy what a user gives for bulges of n pieces; all straight if nothing."""
    with contextlib.suppress(TypeError, ValueError, OverflowError):
        array = np.asarray(bulges)
        if array.shape == (0,):
            return read_only_floats(np.zeros(n))
        if array.ndim == 1 and array.dtype.kind in "iufO":
            return read_only_floats(array)
    raise InputError(
        f"bulges are {reprlib.repr(bulges)}; give a number for each piece."
    )


def as_names(names: Sequence[str]) -> tuple[str, ...]:
    """Copy what a user gives for the names of the sides, or say what it is."""
    if isinstance(names, str) or not isinstance(names, Iterable):
        raise InputError(
            f"the side names of a polygon are {names!r}; give a list with a name for "
            "each piece."
        )
    # Names from a numpy array are made plain: messages show them.
    return tuple(str(name) if isinstance(name, str) else name for name in names)


def as_number(what: str, key: str, value: Any) -> float:
    """Copy a number, or say in words what it is.

    Parameters
    ----------
    what, key : str
        Whose number it is, and its name.
    value : Any
        What the user gave.
    """
    try:
        number = float(value + 0.0)  # adding keeps text from being read as a number
    except (TypeError, ValueError) as error:
        raise InputError(f"{what} has {key} {value!r}; it must be a number.") from error
    if not abs(number) <= FARTHEST:
        raise InputError(
            f"{what} has {key} {number:g}; it must be finite, no larger than "
            f"{FARTHEST:g}."
        )
    return number


def as_positive(what: str, key: str, value: Any) -> float:
    """Copy a positive length in m; parameters are those of `as_number`."""
    number = as_number(what, key, value)
    if number <= 0.0:
        raise InputError(f"{what} has {key} {number:g} m; it must be positive.")
    return number


def as_pair(what: str, key: str, value: Any) -> tuple[float, float]:
    """Copy a pair of numbers in m; parameters are those of `as_number`."""
    try:
        x, y = (number + 0.0 for number in value)
    except (TypeError, ValueError) as error:
        raise InputError(
            f"{what} has {key} {value!r}; give a pair of numbers in m."
        ) from error
    return as_number(what, key, x), as_number(what, key, y)
