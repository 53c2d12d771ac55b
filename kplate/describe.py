"""The one sentence that tells a user whether a drawing was read as it was meant."""

from kplate.errors import InputError
from kplate.outline import Outline
from kplate.units import Unit

MILLIMETRE = Unit("mm", 1e-3)


def describe(
    outline: Outline,
    *,
    thickness: float | None = None,
    density: float | None = None,
    unit: Unit = MILLIMETRE,
) -> str:
    """Say how large a panel is, in a sentence.

    Parameters
    ----------
    outline : Outline
        Its outline.
    thickness : float, optional
        Its thickness in m.
    density : float, optional
        Its density in kg/m3; with the thickness it gives the mass.
    unit : Unit
        Unit of length to write the size in.

    Returns
    -------
    str

    Raises
    ------
    InputError
        If the thickness or density is not positive.

    Examples
    --------
    >>> panel = Outline.polygon([(0, 0), (1.2, 0), (1.2, 0.9), (0, 0.9)])
    >>> describe(panel, thickness=0.006, density=7850.0)
    'your panel is 1200 x 900 mm, 0 holes, area 1.08 m2, mass 50.87 kg'
    """
    x0, y0, x1, y1 = outline.box
    size = f"{(x1 - x0) / unit.size:.6g} x {(y1 - y0) / unit.size:.6g} {unit.symbol}"
    n = len(outline.holes)
    holes = f"{n} hole{'s' * (n != 1)}"
    sentence = f"your panel is {size}, {holes}, area {outline.area:.4g} m2"
    for name, value in (("thickness", thickness), ("density", density)):
        if value is not None and not value > 0.0:
            raise InputError(f"the {name} is {value:g}; it must be positive.")
    if thickness is None or density is None:
        return sentence
    return f"{sentence}, mass {outline.area * thickness * density:.4g} kg"
