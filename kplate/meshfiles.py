"""Mesh files: triangles and their fields, for VTK and what reads it, and meshes made.

`write_vtu` and `read_vtu` keep results; `read_mesh` takes the mesh of a panel from a
.msh or .vtu file, with its named groups: lines on the boundary are sides, lines inside
are seams, triangles are zones, single points are marks.

The arrays of a .vtu file stand in base64, packed by zlib: plates of many triangles with
two load cases take a third of what they take as plain doubles, and the numbers of the
cells' points next to nothing. The bytes of a file depend on the version of zlib.
"""

import contextlib
import io
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kplate.arrays import Floats, Ints
from kplate.errors import InputError
from kplate.files import replacing
from kplate.mesh import Mesh
from kplate.meshgroups import Cells, mesh_of
from kplate.polygon import Chords
from kplate.quantities import unit as parse_unit
from kplate.tracing import outline_of, with_circles

# Heights of a flat mesh agree to this share of its size.
FLAT = 1e-6

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
    point_data: Mapping[str, NDArray[Any]]
    cell_data: Mapping[str, CellValues]


def write_vtu(
    path: Path,
    points: Floats,
    triangles: Ints,
    *,
    lines: Ints,
    point_data: Mapping[str, NDArray[Any]],
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
        Values at the points, (n_points,) or (n_points, k), kept as precise as given.
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
        [("triangle", triangles.astype(np.int32)), ("line", lines.astype(np.int32))],
        point_data={
            _xml(name): np.ascontiguousarray(data) for name, data in point_data.items()
        },
        cell_data={_xml(name): list(pair) for name, pair in cell_data.items()},
    )
    with replacing(path) as temporary:
        # 64 bits, or a field of 4 GB would wrap around.
        meshio.vtu.write(temporary, mesh, compression="zlib", header_type="UInt64")


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


def read_mesh(path: Path, *, unit: str = "m", chords: Chords = "ask") -> Mesh:
    """Read the mesh of a panel, with its named groups.

    Parameters
    ----------
    path : Path
        A .msh file (2.2 or 4.1, text or binary) or a .vtu file of triangles and lines.
        In a .vtu file a group is an array over the cells that is 1 on its own and 0
        elsewhere, under the group's name; numbers of groups under "gmsh:physical",
        "side" or "zone" become "side-1", "zone-1" and so on.
    unit : str
        Unit of length of its coordinates.
    chords : {"ask", "arc", "polygon"}
        What runs of boundary edges on a circle are, as in `Polygon`.

    Returns
    -------
    Mesh
        Groups of lines on the boundary are its sides, those inside its seams; groups of
        triangles are its zones, of single points its marks. Boundary edges on a circle
        know it.

    Raises
    ------
    InputError
        If the file cannot be read, holds other cells than lines and triangles of the
        first order, is not flat, or a boundary edge belongs to no group or to two.
    MeshError
        If the triangles are no mesh of a plate.
    """
    path = Path(path)
    size = parse_unit(unit, "length").size
    raw = _raw_mesh(path)
    _check_kinds(raw)
    points = _flat_points(raw) * size
    cells = {
        dimension: _cells(raw, kind, dimension, path.suffix.lower() == ".vtu")
        for dimension, kind in enumerate(("vertex", "line", "triangle"))
    }
    mesh = mesh_of(points, cells)
    return with_circles(mesh, outline_of(mesh, chords=chords))


def _raw_mesh(path: Path) -> Any:
    """What meshio reads, or an error in words."""
    import meshio

    shown = repr(str(path))
    readers = {".msh": meshio.gmsh.read, ".vtu": meshio.vtu.read}
    if path.suffix.lower() not in readers:
        raise InputError(f"{shown} is no mesh file; name a .msh or .vtu file.")
    if path.is_dir():
        raise InputError(f"{shown} is a folder; name a .msh or .vtu file.")
    quiet = io.StringIO()
    try:
        with contextlib.redirect_stderr(quiet), contextlib.redirect_stdout(quiet):
            return readers[path.suffix.lower()](path)
    except FileNotFoundError as error:
        raise InputError(
            f"there is no file {shown}; name a .msh or .vtu file."
        ) from error
    except OSError as error:
        raise InputError(f"cannot read {shown}: {error.strerror or error}.") from error
    # The readers of meshio let pass what their parts raise; its general `read` would
    # end the program at arrays of text.
    except Exception as error:
        raise InputError(
            f"{shown} is damaged, of a version that cannot be read, or holds arrays of "
            "text; save it as .msh 4.1 or 2.2, or as .vtu without text."
        ) from error


def _check_kinds(raw: Any) -> None:
    """Refuse what is neither a line nor a triangle of the first order."""
    for block in raw.cells:
        if block.type in ("vertex", "line", "triangle"):
            continue
        second = block.type.startswith(("line", "triangle"))
        what = "second or higher order" if second else f"kind {block.type!r}"
        raise InputError(
            f"the mesh holds {len(block.data)} cells of {what}; kplate takes triangles "
            "and lines of the first order. Mesh again without "
            f"{'higher order' if second else 'quadrangles and solids'}."
        )


def _flat_points(raw: Any) -> Floats:
    """Points (n, 2); refuse a mesh that is not at one height."""
    points = np.asarray(raw.points, dtype=float)
    if points.ndim != 2 or not len(points) or not np.isfinite(points).all():
        raise InputError("the mesh has no points, or some that are not finite.")
    used = np.unique(np.concatenate([b.data.ravel() for b in raw.cells] or [[0]]))
    if used.size and (used[0] < 0 or used[-1] >= len(points)):
        raise InputError("the mesh is damaged: its cells name points that it lacks.")
    own = points[used.astype(np.int64)]
    size = float(np.ptp(own, axis=0).max())
    if points.shape[1] == 3 and np.ptp(own[:, 2]) > FLAT * size:
        low, high = own[:, 2].min(), own[:, 2].max()
        raise InputError(
            f"the mesh is not flat: z runs from {low:g} to {high:g} in its own unit; "
            "turn the panel into the xy plane."
        )
    return points[:, :2]


def _cells(raw: Any, kind: str, dimension: int, vtu: bool) -> Cells:
    """All cells of one kind, each once, with their groups."""
    blocks = [i for i, block in enumerate(raw.cells) if block.type == kind]
    width = dimension + 1
    empty = np.empty((0, width), dtype=np.int64)
    nodes = np.concatenate([raw.cells[i].data for i in blocks] or [empty])
    counts = [len(raw.cells[i].data) for i in blocks]
    claims: dict[str, list[Ints]] = {}
    for name, rows in _claims(raw, blocks, counts, (dimension, vtu)):
        if rows.size:
            claims.setdefault(name, []).append(rows)
    # Files name a cell once for each of its groups.
    order = np.sort(nodes, axis=1)
    _, first, number = np.unique(order, axis=0, return_index=True, return_inverse=True)
    groups = {
        name: np.unique(number.reshape(-1)[np.concatenate(rows)])
        for name, rows in claims.items()
    }
    return Cells(nodes=nodes[first].astype(np.int64), groups=groups)


def _claims(
    raw: Any, blocks: list[int], counts: list[int], form: tuple[int, bool]
) -> Iterator[tuple[str, Ints]]:
    """Names of groups and the cells of one kind that they claim."""
    dimension, vtu = form
    word = ("mark", "side", "zone")[dimension]
    names = {
        (int(data[1]), int(data[0])): name
        for name, data in raw.field_data.items()
        if np.size(data) == 2
    }
    for key in ("gmsh:physical", *((word,) if vtu else ())):
        if key in raw.cell_data:
            tags = _joined(raw.cell_data[key], blocks, counts)
            # A negative number stands for a group whose lines run the other way.
            tags = np.abs(tags) if key == "gmsh:physical" else tags + 1
            for tag in np.unique(tags[tags > 0]).tolist():
                name = names.get((dimension, tag), f"{word}-{tag}")
                yield name, np.flatnonzero(tags == tag)
    starts = np.cumsum([0, *counts])
    for name, sets in raw.cell_sets.items():
        if not name.startswith("gmsh:"):
            for start, i in zip(starts, blocks, strict=False):
                if sets[i] is not None:
                    yield name, np.asarray(sets[i], dtype=np.int64) + start
    if vtu:
        for name, data in raw.cell_data.items():
            if _marks_a_group(name, data):
                yield name, np.flatnonzero(_joined(data, blocks, counts))


def _joined(data: Any, blocks: list[int], counts: list[int]) -> Ints:
    """Values of some blocks in a row; cells that lack one have 0."""
    parts = [
        np.asarray(data[i]).astype(np.int64)
        if len(data[i]) == n
        else np.zeros(n, dtype=np.int64)
        for i, n in zip(blocks, counts, strict=True)
    ]
    return np.concatenate([*parts, np.empty(0, dtype=np.int64)])


def _marks_a_group(name: str, data: Any) -> bool:
    """Whether an array of a .vtu file is 1 on some cells and 0 on the others."""
    if ":" in name or name in ("side", "zone", "mark") or name.startswith("vtk"):
        return False
    values = [np.asarray(part) for part in data]
    return all(
        part.ndim == 1 and np.isin(part, (0, 1)).all() and part.dtype.kind in "iu"
        for part in values
    )


def _xml(name: str) -> str:
    """Spell a name as an XML attribute in ASCII; meshio writes it as it is."""
    from xml.sax.saxutils import escape  # which takes long to import

    if not name.isprintable():
        raise InputError(
            f"the name {name!r} cannot stand in a VTU file; use letters, digits and "
            "signs that can be printed."
        )
    quoted = escape(name, {'"': "&quot;"})
    return quoted.encode("ascii", "xmlcharrefreplace").decode("ascii")
