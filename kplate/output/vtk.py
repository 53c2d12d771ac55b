"""A solution as a VTU file, for `kplate view` and any program that reads VTK.

Points and point data are those of `Solution.point_fields`, where a place on a step or a
seam stands once for each side of it, and on the edge of a C1 element once for each
triangle; with several load cases each name starts with its case, "CASE: NAME". The
cells are the small triangles between the points, then the pieces of the boundary as
lines. Cell data are "zone", the zone of a triangle (-1 on lines), "side", the number of
a line's side (-1 on triangles), "triangle", the triangle of the mesh that a small one
is part of (-1 on lines), and "thickness [m]" of a triangle (0 on lines). The names of
the sides, and all else that a VTU file cannot hold, stand in the record
(`kplate.output.record`).

Fields are in single precision: their round-off, 6e-8 of a value, is far below what lies
between two samples (`raw.TOLERANCE`, 5e-3 of the range). Coordinates stay double.
"""

from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kplate.errors import InputError
from kplate.meshfiles import Fields, write_vtu
from kplate.solution import Solution

NOTHING = -1  # zone of a line, side of a triangle
THICKNESS = "thickness [m]"


def write_vtk(solution: Solution, path: Path, *, design: bool = False) -> Path:
    """Write all fields of a solution, in all its cases, as a VTU file.

    Parameters
    ----------
    solution : Solution
        What to write.
    path : Path
        The file, ending in ``.vtu``; one that exists is replaced.
    design : bool, optional
        Whether to write the design moments of reinforcement, too: bottom x, bottom y,
        top x, top y.

    Returns
    -------
    Path
        The file.

    Raises
    ------
    InputError
        If the name does not end in ``.vtu``, a case has a name that XML cannot hold,
        or the file cannot be written.
    """
    path = Path(path)
    if path.suffix != ".vtu":
        raise InputError(
            f"{str(path)!r} does not end in .vtu, which tells programs its format; "
            "name it so."
        )
    fields = solution_fields(solution, design=design)
    write_vtu(
        path,
        fields.points,
        fields.triangles,
        lines=fields.lines,
        point_data=fields.point_data,
        cell_data=fields.cell_data,
    )
    return path


def solution_fields(solution: Solution, *, design: bool = False) -> Fields:
    """What a VTU file holds of a solution."""
    mesh, samples = solution.mesh, solution.samples
    points = samples.points
    pieces, owners = len(samples.rim), samples.owners
    return Fields(
        points=np.column_stack([points, np.zeros(len(points))]),
        triangles=samples.triangles,
        lines=samples.rim,
        point_data=field_arrays(solution, design=design),
        cell_data={
            "zone": (mesh.zones[owners], np.full(pieces, NOTHING)),
            "side": (
                np.full(len(owners), NOTHING),
                mesh.boundary_sides[samples.rim_owners],
            ),
            "triangle": (owners, np.full(pieces, NOTHING)),
            THICKNESS: (
                solution.plate.thicknesses[mesh.zones[owners]],
                np.zeros(pieces),
            ),
        },
    )


def array_name(solution: Solution, case: str, field: str) -> str:
    """Name in the file of a field of a load case."""
    return field if len(solution.cases) == 1 else f"{case}: {field}"


def field_arrays(
    solution: Solution, *, design: bool = False
) -> dict[str, NDArray[Any]]:
    """Fields of all cases under their names in the file, as they stand there."""
    return {
        array_name(solution, case, field): values.astype(np.float32)
        for case in solution.cases
        for field, values in solution.point_fields(case=case, design=design).items()
    }
