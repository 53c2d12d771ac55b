"""Mesh files: triangles and their fields, written for VTK and what reads it.

The arrays of a .vtu file stand uncompressed (base64): zlib makes 200,000 triangles with
all their fields a third smaller and takes eight times as long, and what zlib makes of
the same numbers depends on its version.
"""

from collections.abc import Mapping
from pathlib import Path
from typing import Any
from xml.sax.saxutils import escape

import numpy as np
from numpy.typing import NDArray

from kplate.arrays import Floats, Ints
from kplate.errors import InputError
from kplate.files import replacing

CellValues = tuple[NDArray[Any], NDArray[Any]]


def write_vtu(
    path: Path,
    points: Floats,
    triangles: Ints,
    *,
    lines: Ints,
    point_data: Mapping[str, Floats],
    cell_data: Mapping[str, CellValues],
) -> None:
    """Write triangles and lines with their data as a VTU file.

    Parameters
    ----------
    path : Path
        The file; one that exists is replaced once the new one is whole.
    points : ndarray, shape (n_points, 3)
        Coordinates in m.
    triangles : ndarray, shape (n_triangles, 3)
        Point numbers: cells 0 to n_triangles - 1.
    lines : ndarray, shape (n_lines, 2)
        Point numbers: the cells after the triangles.
    point_data : mapping of str to ndarray
        Values at the points, (n_points,) or (n_points, k).
    cell_data : mapping of str to pair of ndarray
        Values on the triangles, and on the lines.

    Raises
    ------
    InputError
        If a name holds a character that XML cannot, or the file cannot be written.
    """
    import meshio

    mesh = meshio.Mesh(
        points,
        [("triangle", triangles), ("line", lines)],
        point_data={
            _xml(name): np.ascontiguousarray(data) for name, data in point_data.items()
        },
        cell_data={_xml(name): list(pair) for name, pair in cell_data.items()},
    )
    with replacing(path) as temporary:
        # 64 bits, or a field of 4 GB would wrap around.
        meshio.vtu.write(temporary, mesh, compression=None, header_type="UInt64")


def _xml(name: str) -> str:
    """Spell a name as an XML attribute in ASCII; meshio writes it as it is."""
    if not name.isprintable():
        raise InputError(
            f"the name {name!r} cannot stand in a VTU file; use letters, digits and "
            "signs that can be printed."
        )
    quoted = escape(name, {'"': "&quot;"})
    return quoted.encode("ascii", "xmlcharrefreplace").decode("ascii")
