"""Outlines that a panel file takes from a drawing or a mesh beside it."""

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any, cast

from kplate.drawings import Drawing
from kplate.dxf import read_dxf
from kplate.fields import Fields, within
from kplate.guard import read_step_guarded
from kplate.meshfiles import read_mesh
from kplate.outline import Outline
from kplate.polygon import Chords
from kplate.shapes import Circle
from kplate.tracing import outline_of
from kplate.vertices import read_csv

# What fields of an [outline] may stand beside the file, by its ending.
TAKES = {
    ".dxf": ("unit", "layer", "snap", "chords"),
    ".step": ("unit", "snap", "chords"),
    ".stp": ("unit", "snap", "chords"),
    ".csv": ("unit", "chords"),
    ".msh": ("unit", "chords"),
}
OPTIONS = ("unit", "layer", "snap", "chords")
NEED_UNIT = (".csv", ".msh")  # they do not say it themselves


def read_outline_file(fields: Fields, folder: Path) -> tuple[Drawing, Path]:
    """Read the file that an [outline] names.

    Parameters
    ----------
    fields : Fields
        The section.
    folder : Path
        Where the panel file is; a path starts from there.

    Returns
    -------
    drawing : Drawing
        Its rim has the names of the section's "sides", if there are any.
    path : Path
        The file.

    Raises
    ------
    InputError
        If the file is of no known kind, cannot be read, or a field does not suit it.
    """
    path = folder / fields.word("file")
    ending = path.suffix.lower()
    if ending not in TAKES:
        raise fields.refuse("file", f"it must end in one of {', '.join(TAKES)}.")
    for key in OPTIONS:
        if key in fields and key not in TAKES[ending]:
            raise fields.refuse(key, f"it does not go with a {ending} file.")
    options = _options(fields)
    if ending in NEED_UNIT:
        fields.value("unit")
    with within(fields.place("file")):
        drawing = _READERS[ending](path, **options)
    if "sides" not in fields:
        return drawing, path
    return replace(drawing, outline=_renamed(drawing.outline, fields)), path


def _options(fields: Fields) -> dict[str, Any]:
    """Options of a reader, as far as they are stated."""
    options: dict[str, Any] = {}
    if "unit" in fields:
        options["unit"] = fields.unit("unit", "length").symbol
    if "layer" in fields:
        several = isinstance(fields.value("layer"), list)
        options["layer"] = fields.words("layer") if several else fields.word("layer")
    if "snap" in fields:
        options["snap"] = fields.positive("snap", "length")
    if "chords" in fields:
        options["chords"] = cast(Chords, fields.choice("chords", ("arc", "polygon")))
    return options


def _mesh_drawing(path: Path, unit: str, **options: Any) -> Drawing:
    """Outline of a mesh with the names of its sides; the rest is not taken."""
    mesh = read_mesh(path, unit=unit, **options)
    outline = outline_of(mesh, **options)
    inside = [("zone", name) for name in mesh.zone_names[1:]]
    inside += [("seam", name) for name in mesh.seam_names]
    inside += [("mark", name) for name in mesh.mark_names]
    return Drawing(
        outline=outline,
        unit=unit,
        notes=outline.notes,
        ignored=(
            f"{len(mesh.triangles)} triangles: the panel is meshed anew",
            *(f"{what} {name!r} of the mesh: state it here" for what, name in inside),
        ),
    )


_READERS: dict[str, Callable[..., Drawing]] = {
    ".dxf": read_dxf,
    ".step": read_step_guarded,
    ".stp": read_step_guarded,
    ".csv": read_csv,
    ".msh": _mesh_drawing,
}


def _renamed(outline: Outline, fields: Fields) -> Outline:
    """Give the sides of the rim, in their order, the names of the section."""
    names, rim = fields.words("sides"), outline.rim
    old = list(dict.fromkeys(rim.line.sides))
    if len(names) != len(old):
        raise fields.refuse(
            "sides", f"the rim in the file has {len(old)}; name each or none."
        )
    with within(fields.where):
        if isinstance(rim, Circle):
            return replace(outline, rim=replace(rim, name=names[0]))
        new = dict(zip(old, names, strict=True))
        sides = tuple(new[side] for side in rim.line.sides)
        return replace(outline, rim=replace(rim.line, sides=sides))
