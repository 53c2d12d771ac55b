"""Mesh files: triangles and their fields, for VTK and what reads it.

The arrays of a .vtu file stand uncompressed (base64): zlib makes a plate with all its
fields a third smaller and takes some twenty times as long, and the bytes it makes of
the same numbers depend on its version.
"""

import contextlib
import io
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any
from xml.sax.saxutils import escape

import numpy as np
from numpy.typing import NDArray

from kplate.arrays import Floats, Ints
from kplate.errors import InputError
from kplate.files import replacing

CellValues = tuple[NDArray[Any], NDArray[Any]]


@dataclass(frozen=True, eq=False, kw_only=True)
class Fields:
    """What a VTU file of triangles and lines holds.

    Parameters
    ----------
    points : ndarray, shape (n_points, 3)
        Coordinates in m.
    triangles : ndarray, shape (n_triangles, 3)
        Point numbers.
    lines : ndarray, shape (n_lines, 2)
        Point numbers.
    point_data : mapping of str to ndarray
        Values at the points, (n_points,) or (n_points, k).
    cell_data : mapping of str to pair of ndarray
        Values on the triangles, and on the lines.
    """

    points: Floats
    triangles: Ints
    lines: Ints
    point_data: Mapping[str, Floats]
    cell_data: Mapping[str, CellValues]


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


def read_vtu(path: Path) -> Fields:
    """Read a VTU file as `write_vtu` writes them.

    Raises
    ------
    InputError
        If the file cannot be read, is not a VTU file, ends too early or is damaged.
    """
    path = Path(path)
    shown = repr(str(path))
    try:
        if path.is_dir():
            raise InputError(f"{shown} is a folder; name a .vtu file.")
        content = path.read_bytes()
    except FileNotFoundError as error:
        raise InputError(
            f"there is no file {shown}; name a .vtu file that kplate check wrote."
        ) from error
    except (OSError, ValueError) as error:
        if isinstance(error, InputError):
            raise
        why = getattr(error, "strerror", None) or error
        raise InputError(f"cannot read {shown}: {why}.") from error
    if b"<VTKFile" not in content[:1000] or b"UnstructuredGrid" not in content[:1000]:
        raise InputError(
            f"{shown} is not a VTU file; name a .vtu file that kplate check wrote."
        )
    if not content.rstrip().endswith(b"</VTKFile>"):
        raise InputError(
            f"{shown} ends too early: it was not written or copied to its end; run "
            "kplate check again."
        )
    try:
        return _parse(path)
    except Exception as error:  # meshio lets pass what its parts raise
        raise InputError(
            f"{shown} is damaged, or not of triangles and lines; run kplate check "
            "again."
        ) from error


def _parse(path: Path) -> Fields:
    """Take a file apart; raises whatever is wrong with it."""
    import meshio

    with contextlib.redirect_stderr(io.StringIO()):  # its reader prints warnings
        mesh = meshio.vtu.read(path)
    kinds = [block.type for block in mesh.cells]
    if kinds not in (["triangle"], ["triangle", "line"]):
        raise ValueError(f"cells are {kinds}")
    blocks = [block.data.astype(np.int64) for block in mesh.cells]
    for block in blocks:
        if not (block.size and block.min() >= 0 and block.max() < len(mesh.points)):
            raise ValueError("cells name points that are not there")
    if len(blocks) == 1:
        blocks.append(np.empty((0, 2), dtype=np.int64))
    point_data = {}
    for name, data in mesh.point_data.items():
        if len(data) != len(mesh.points) or data.ndim > 2:
            raise ValueError(f"{name} has shape {data.shape}")
        point_data[name] = data.astype(np.float64)
    if mesh.points.shape[1] != 3 or not np.isfinite(mesh.points).all():
        raise ValueError("points are not finite")
    return Fields(
        points=mesh.points.astype(np.float64),
        triangles=blocks[0],
        lines=blocks[1],
        point_data=point_data,
        cell_data={
            name: (values[0], values[1] if len(values) > 1 else values[0][:0])
            for name, values in mesh.cell_data.items()
        },
    )


def _xml(name: str) -> str:
    """Spell a name as an XML attribute in ASCII; meshio writes it as it is."""
    if not name.isprintable():
        raise InputError(
            f"the name {name!r} cannot stand in a VTU file; use letters, digits and "
            "signs that can be printed."
        )
    quoted = escape(name, {'"': "&quot;"})
    return quoted.encode("ascii", "xmlcharrefreplace").decode("ascii")
