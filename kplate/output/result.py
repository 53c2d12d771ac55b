"""A result, of a solution or read back from its files, as pictures and windows see it.

The fields come from a .vtu file as `write_vtk` writes them, or from a solution. The
record (.json) beside the file is used where it belongs to it; without one there are no
names, supports, loads and reactions.
"""

import json
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property
from pathlib import Path
from typing import Any

import numpy as np

from kplate.arrays import Bools, Floats
from kplate.errors import InputError
from kplate.meshfiles import Fields, read_vtu
from kplate.output.record import shown_record
from kplate.output.shades import Shade, shades
from kplate.output.told import LeftOut, Told, told
from kplate.output.vtk import solution_fields
from kplate.solution import Solution
from kplate.units import DisplayUnits

DEFLECTION = "deflection [m]"


@dataclass(frozen=True, eq=False, kw_only=True)
class Result:
    """What can be shown of a solved plate.

    Parameters
    ----------
    fields : Fields
        Triangles, rim and fields, SI units.
    cases : mapping of str to str
        Load cases, and what the names of their arrays start with.
    told : Told
        What the record tells.
    name : str
        Name of its file without the ending, for files made from it.
    folder : Path
        Where that is.
    units : DisplayUnits
        What numbers are shown in.
    """

    fields: Fields
    cases: Mapping[str, str]
    told: Told = field(default_factory=Told)
    name: str = "plate"
    folder: Path = Path()
    units: DisplayUnits = field(default_factory=DisplayUnits)

    def values(self, case: str, array: str) -> Floats:
        """A field of a case at the points."""
        return self.fields.point_data[self.cases[case] + array]

    def has(self, case: str, array: str) -> bool:
        """Whether there is such a field."""
        return self.cases[case] + array in self.fields.point_data

    def shown(self, case: str, shade: Shade, face: str = "") -> Floats:
        """What a shade colours the points by, in its unit."""
        values = self.values(case, shade.array(face))
        own = values if shade.component is None else values[:, shade.component]
        return own / shade.unit.size

    def left_out(self, case: str) -> list[LeftOut]:
        """Places without a finite moment in a case."""
        return [disc for disc in self.told.left_out if disc.case in (None, case)]

    def judged(self, case: str) -> Bools:
        """Points outside those places, (n_points,); all where that leaves none."""
        points = self.fields.points[:, :2]
        outside = np.ones(len(points), dtype=bool)
        for disc in self.left_out(case):
            outside &= np.hypot(*(points - disc.place).T) >= disc.radius
        return outside if outside.any() else ~outside

    @cached_property
    def shades(self) -> list[Shade]:
        """All that the plate can be coloured by, deflection first."""
        prefix = next(iter(self.cases.values()))
        arrays = {
            name.removeprefix(prefix): values
            for name, values in self.fields.point_data.items()
            if name.startswith(prefix)
        }
        found = shades(arrays, self.units)
        return sorted(found, key=lambda shade: DEFLECTION not in shade.arrays.values())

    @property
    def size(self) -> float:
        """Mean size of the plate: the side of a square as large as its box, in m."""
        extent = np.ptp(self.fields.points[:, :2], axis=0)
        return float(np.sqrt(np.prod(extent)))


def result_of(solution: Solution) -> Result:
    """Take what can be shown out of a solution."""
    return replace(fields_of(solution), told=told(shown_record(solution)))


def fields_of(solution: Solution, units: DisplayUnits | None = None) -> Result:
    """Take fields and places left out from a solution, but not its reactions."""
    own = {
        case: "" if len(solution.cases) == 1 else f"{case}: " for case in solution.cases
    }
    left_out = tuple(
        LeftOut(
            place=disc.place,
            radius=disc.radius,
            reason=disc.reason,
            case=disc.case or None,
        )
        for disc in solution.excluded
    )
    return Result(
        fields=solution_fields(solution),
        cases=own,
        told=Told(left_out=left_out),
        units=DisplayUnits() if units is None else units,
    )


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
    path = Path(path)
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
    result = Result(fields=fields, cases=cases, name=path.stem, folder=path.parent)
    try:
        record = json.loads(path.with_suffix(".json").read_text("utf-8"))
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
    fields, mesh = result.fields, record["mesh"]
    if (mesh["field triangles"], mesh["field points"]) != (
        len(fields.triangles),
        len(fields.points),
    ):
        raise ValueError("the record is of another mesh")
    names = record["field_names"]
    if set(names) != set(fields.point_data):
        raise ValueError("the record is of other fields")
    own = {
        str(names[f"{prefix}{DEFLECTION}"]["case"]): prefix
        for prefix in result.cases.values()
    }
    found = told(record)
    if not set(own) <= set(found.fences):
        raise ValueError("the record is of other cases")
    return replace(result, cases=own, told=found)
