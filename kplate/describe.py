"""The one sentence that tells a user whether a drawing was read as it was meant."""

from kplate.outline import Outline
from kplate.units import Unit

MILLIMETRE = Unit("mm", 1e-3)


def describe(
    outline: Outline, *, mass: float | None = None, unit: Unit = MILLIMETRE
) -> str:
    """Say how large a panel is, in a sentence.

    Parameters
    ----------
    outline : Outline
        Its outline.
    mass : float, optional
        Its mass in kg, where it is known.
    unit : Unit
        Unit of length to write the size in.

    Returns
    -------
    str

    Examples
    --------
    >>> panel = Outline.polygon([(0, 0), (1.2, 0), (1.2, 0.9), (0, 0.9)])
    >>> describe(panel, mass=50.868)
    'your panel is 1200 x 900 mm, 0 holes, area 1.08 m2, mass 50.87 kg'
    """
    x0, y0, x1, y1 = outline.box
    size = f"{(x1 - x0) / unit.size:.6g} x {(y1 - y0) / unit.size:.6g} {unit.symbol}"
    n = len(outline.holes)
    holes = f"{n} hole{'s' * (n != 1)}"
    sentence = f"your panel is {size}, {holes}, area {outline.area:.4g} m2"
    return sentence if mass is None else f"{sentence}, mass {mass:.4g} kg"
