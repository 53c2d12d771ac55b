"""What a plate can be coloured by: the fields of a result, component by component.

A field on the top and on the bottom face is one quantity with two faces. Units are
those of display.
"""

from collections.abc import Mapping
from dataclasses import dataclass

from kplate.arrays import Floats
from kplate.units import DisplayUnits, Unit

FACES = ("top", "bottom")
# What the components of a field are called, by its first word or their number.
COMPONENTS: dict[str | int, tuple[str, ...]] = {
    "principal": ("larger", "smaller"),
    "design": ("bottom x", "bottom y", "top x", "top y"),
    2: ("x", "y"),
    3: ("xx", "yy", "xy"),
}


@dataclass(frozen=True, eq=False, kw_only=True)
class Shade:
    """One quantity.

    Parameters
    ----------
    field : str
        Name of the field, without face and unit.
    word : str
        Which component of it; nothing where it has one only.
    arrays : mapping of str to str
        The field it comes from, without its case, by face; under "" where it has none.
    component : int, optional
        Which column of that.
    unit : Unit
        What it is shown in.
    """

    field: str
    word: str
    arrays: Mapping[str, str]
    component: int | None
    unit: Unit

    @property
    def name(self) -> str:
        """Field and component."""
        return f"{self.field} {self.word}".strip()

    @property
    def faces(self) -> tuple[str, ...]:
        """Faces it is known on; none where it does not depend on the face."""
        return tuple(face for face in self.arrays if face)

    def array(self, face: str) -> str:
        """Field it comes from on a face."""
        return self.arrays.get(face) or next(iter(self.arrays.values()))

    def title(self, face: str) -> str:
        """Quantity, face where it matters, and unit."""
        words = f"{self.name}, {face}" if self.faces else self.name
        return f"{words} [{self.unit.symbol}]"


def shades(arrays: Mapping[str, Floats], units: DisplayUnits) -> list[Shade]:
    """All quantities of the fields of a case, in their order."""
    grouped: dict[tuple[str, str], dict[str, str]] = {}
    for array in arrays:
        base, bracket, symbol = array.removesuffix("]").rpartition(" [")
        base, symbol = (base, symbol) if bracket else (array, "-")
        face = next((f for f in FACES if base.endswith(f" {f}")), "")
        base = base.removesuffix(f" {face}") if face else base
        grouped.setdefault((base, symbol), {})[face] = array
    found = []
    for (base, symbol), own in grouped.items():
        values = arrays[next(iter(own.values()))]
        for component, word in _components(base, values):
            found.append(
                Shade(
                    field=base,
                    word=word,
                    arrays=own,
                    component=component,
                    unit=_unit(symbol, units),
                )
            )
    return found


def _components(base: str, values: Floats) -> list[tuple[int | None, str]]:
    """Columns of a field, each with its word."""
    if values.ndim == 1:
        return [(None, "")]
    count = values.shape[1]
    words = COMPONENTS.get(base.split(" ")[0]) or COMPONENTS.get(count, ())
    if len(words) != count:
        words = tuple(str(k + 1) for k in range(count))
    return list(enumerate(words))


def _unit(symbol: str, units: DisplayUnits) -> Unit:
    """Unit to show a field in whose unit in the file is this."""
    shown = {
        "m": units.deflection,
        "Pa": units.stress,
        "N": units.moment,
        "N per m": units.line_force,
    }
    return shown.get(symbol, Unit(symbol, 1.0))
