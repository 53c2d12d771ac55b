"""A result read back from its files: fields, load cases, and the record beside them.

The fields come from a .vtu file as `write_vtk` writes them. The record (.json) beside
it is used where it belongs to that file; without one there are no names and no title.
"""

import json
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from kplate.arrays import Bools, Floats
from kplate.errors import InputError
from kplate.meshfiles import Fields, read_vtu
from kplate.units import DisplayUnits, Unit

DEFLECTION = "deflection [m]"
# What the components of a field are called, by its first word or their number.
COMPONENTS: dict[str | int, tuple[str, ...]] = {
    "principal": ("larger", "smaller"),
    "design": ("bottom x", "bottom y", "top x", "top y"),
    2: ("x", "y"),
    3: ("xx", "yy", "xy"),
}


@dataclass(frozen=True, kw_only=True)
class Shade:
    """One thing to colour a plate by.

    Parameters
    ----------
    name : str
        Its name, component included, without the unit.
    array : str
        The field it comes from, without its case.
    component : int, optional
        Which column of that.
    unit : Unit
        What it is shown in.
    """

    name: str
    array: str
    component: int | None
    unit: Unit

    @property
    def title(self) -> str:
        """Quantity and unit."""
        return f"{self.name} [{self.unit.symbol}]"


@dataclass(frozen=True, eq=False, kw_only=True)
class Result:
    """A result as its files tell it.

    Parameters
    ----------
    fields : Fields
        Triangles, rim and fields, SI units.
    cases : mapping of str to str
        Load cases, and what the names of their arrays start with.
    title : str
        Name of the panel; may be empty.
    side_names : tuple of str
        Names of the sides by number; may be empty.
    excluded : tuple of tuple
        Places without a finite moment: x, y and radius in m, and the case or ``None``.
    """

    fields: Fields
    cases: Mapping[str, str]
    title: str = ""
    side_names: tuple[str, ...] = ()
    excluded: tuple[tuple[float, float, float, str | None], ...] = ()

    def values(self, case: str, array: str) -> Floats:
        """A field of a case at the points."""
        return self.fields.point_data[self.cases[case] + array]

    def shown(self, case: str, shade: Shade) -> Floats:
        """What a shade colours the points by, in its unit."""
        values = self.values(case, shade.array)
        own = values if shade.component is None else values[:, shade.component]
        return own / shade.unit.size

    def left_out(self, case: str) -> list[tuple[float, float, float]]:
        """Places without a finite moment in a case, and their radii, in m."""
        return [(x, y, r) for x, y, r, own in self.excluded if own in (None, case)]

    def judged(self, case: str) -> Bools:
        """Points outside those places, (n_points,); all where that leaves none."""
        points = self.fields.points[:, :2]
        outside = np.ones(len(points), dtype=bool)
        for x, y, radius in self.left_out(case):
            outside &= np.hypot(*(points - (x, y)).T) >= radius
        return outside if outside.any() else ~outside

    def shades(self) -> list[Shade]:
        """All that the plate can be coloured by, deflection first."""
        prefix = next(iter(self.cases.values()))
        arrays = {
            name.removeprefix(prefix): values
            for name, values in self.fields.point_data.items()
            if name.startswith(prefix)
        }
        found = [s for array, values in arrays.items() for s in _shades(array, values)]
        return sorted(found, key=lambda shade: shade.array != DEFLECTION)

    def side_places(self) -> dict[str, Floats]:
        """Middle of each side's rim, (3,) in m."""
        sides = self.fields.cell_data.get("side", (None, np.empty(0)))[1]
        if len(sides) != len(self.fields.lines):
            return {}
        ends = self.fields.points[self.fields.lines]
        middles = ends.mean(axis=1)
        lengths = np.linalg.norm(ends[:, 1] - ends[:, 0], axis=1)
        places = {}
        for number, name in enumerate(self.side_names):
            own = middles[sides == number]
            if len(own):
                # Pieces are shorter towards corners.
                centre = np.average(own, axis=0, weights=lengths[sides == number])
                off = np.linalg.norm(own - centre, axis=1)
                places[name] = own[off.argmin()]
        return places


def read_result(path: Path) -> Result:
    """Read a result, and the record beside it if that belongs to it.

    Parameters
    ----------
    path : Path
        A .vtu file that `write_vtk` wrote.

    Returns
    -------
    Result

    Raises
    ------
    InputError
        If the file cannot be read, is damaged, or holds no deflection.
    """
    fields = read_vtu(path)
    cases = {
        name.removesuffix(DEFLECTION).removesuffix(": "): name.removesuffix(DEFLECTION)
        for name, values in fields.point_data.items()
        if (name == DEFLECTION or name.endswith(f": {DEFLECTION}")) and values.ndim == 1
    }
    if not cases:
        held = ", ".join(fields.point_data) or "none"
        raise InputError(
            f"{str(path)!r} holds no field {DEFLECTION!r} (its point fields: {held}); "
            "name a .vtu file that kplate check wrote."
        )
    result = Result(fields=fields, cases=cases)
    try:
        record = json.loads(Path(path).with_suffix(".json").read_text("utf-8"))
        return _with_record(result, record)
    except (
        OSError,
        ValueError,
        TypeError,
        LookupError,
        AttributeError,
        RecursionError,
    ):
        return result  # none there, or not of this result


def _with_record(result: Result, record: Any) -> Result:
    """Add what the record of a result tells; raises where it is of something else."""
    fields = result.fields
    mesh = record["mesh"]
    if (mesh["field triangles"], mesh["field points"]) != (
        len(fields.triangles),
        len(fields.points),
    ):
        raise ValueError("the record is of another mesh")
    names = record["field_names"]
    if set(names) != set(fields.point_data):
        raise ValueError("the record is of other fields")
    excluded = []
    for place in record["excluded"]:
        x, y = place["place [m]"]
        excluded.append((float(x), float(y), float(place["radius [m]"]), place["case"]))
    return Result(
        fields=fields,
        cases={
            str(names[f"{prefix}{DEFLECTION}"]["case"]): prefix
            for prefix in result.cases.values()
        },
        title=str(record.get("panel", {}).get("name", "")),
        side_names=tuple(str(name) for name in record["side_names"]),
        excluded=tuple(excluded),
    )


def _shades(array: str, values: Floats) -> list[Shade]:
    """Shades of one field, one for each component."""
    base, bracket, symbol = array.removesuffix("]").rpartition(" [")
    unit = _unit(symbol) if bracket else Unit("-", 1.0)
    base = base if bracket else array
    if values.ndim == 1:
        return [Shade(name=base, array=array, component=None, unit=unit)]
    count = values.shape[1]
    words = COMPONENTS.get(base.split(" ")[0]) or COMPONENTS.get(count, ())
    if len(words) != count:
        words = tuple(str(k + 1) for k in range(count))
    return [
        Shade(name=f"{base} {word}", array=array, component=k, unit=unit)
        for k, word in enumerate(words)
    ]


def _unit(symbol: str) -> Unit:
    """Unit to show a field in whose unit in the file is this."""
    units = DisplayUnits()
    shown = {
        "m": units.deflection,
        "Pa": units.stress,
        "N": units.moment,
        "N per m": units.line_force,
    }
    return shown.get(symbol, Unit(symbol, 1.0))
