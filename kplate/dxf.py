"""Outlines from DXF drawings, by ezdxf.

Lines, arcs, circles, polylines, ellipses and splines of the model space are taken, seen
from above; everything else is listed as ignored.
"""

import contextlib
import math
from collections import Counter
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

import numpy as np

from kplate.chaining import (
    Piece,
    Point,
    arrays,
    chain,
    closed_lines,
    count,
    place,
    words,
)
from kplate.drawings import Drawing, drawing_of
from kplate.entities import TAKEN, is_line
from kplate.errors import InputError
from kplate.fitting import Arc
from kplate.polygon import Chords
from kplate.quantities import unit as parse_unit
from kplate.units import Unit

# Units by their number in $INSUNITS. Source: ezdxf.units.
_INSUNITS = {
    1: "in", 2: "ft", 4: "mm", 5: "cm", 6: "m", 7: "km", 8: "microinch", 9: "mil",
    10: "yard", 13: "micrometer", 14: "dm",
}  # fmt: skip
# Lines of layers that were not asked for may stick out of the closed line by this share
# of its size, as centre lines do; beyond, the panel may be on them.
STICK_OUT = 0.05


def read_dxf(
    path: Path,
    *,
    unit: str | None = None,
    layer: str | Sequence[str] | None = None,
    snap: float | None = None,
    chords: Chords = "ask",
) -> Drawing:
    """Read the outline of a panel from a DXF drawing.

    Parameters
    ----------
    path : Path
        The drawing.
    unit : str, optional
        Its unit of length; what the file says of it is taken if left out.
    layer : str or sequence of str, optional
        The layer, or the layers, that the panel is drawn on; needed where several hold
        closed lines.
    snap : float, optional
        Free ends closer than this, in m, are joined; 1e-4 of the size if left out.
    chords : {"ask", "arc", "polygon"}
        What runs of straight pieces on a circle are, as in `Polygon`.

    Returns
    -------
    Drawing

    Raises
    ------
    InputError
        If the file cannot be read, states no unit, or is not the drawing of one panel.
    """
    document = _open(Path(path))
    its_unit, notes = _unit(document, unit)
    pieces, ignored = _take(document, its_unit)
    pieces, others, more = _choose(pieces, layer, its_unit, snap)
    ignored += [f"{words(piece, its_unit)}: on another layer" for piece in others]
    if not pieces and ignored:
        kinds = Counter(line.partition(" ")[0] for line in ignored)
        held = ", ".join(f"{number} {kind}" for kind, number in sorted(kinds.items()))
        raise InputError(
            "the drawing holds no lines or arcs that could be an outline, only "
            f"{held}; explode blocks, and draw the panel with lines, arcs, polylines "
            "or circles."
        )
    return drawing_of(
        chain(pieces, unit=its_unit, snap=snap),
        unit=its_unit,
        chords=chords,
        notes=(*notes, *more),
        ignored=ignored,
    )


def _open(path: Path) -> Any:
    """The document of a file, or an error in words."""
    from ezdxf.filemanagement import readfile

    shown = repr(str(path))
    try:
        if path.is_dir():
            raise InputError(f"{shown} is a folder; name a .dxf file.")
        with path.open("rb") as file:
            head = file.read(6)
        if head.startswith(b"AC10"):
            raise InputError(f"{shown} is a DWG file; save the drawing as DXF.")
        return readfile(path)
    except FileNotFoundError as error:
        raise InputError(f"there is no file {shown}; name a .dxf file.") from error
    except InputError:
        raise
    except Exception as error:  # ezdxf lets pass what its parts raise
        why = getattr(error, "strerror", None)
        reason = f": {why}" if why else "; it is no DXF file, or damaged"
        raise InputError(f"cannot read {shown}{reason}.") from error


def _unit(document: Any, stated: str | None) -> tuple[Unit, list[str]]:
    """Unit of the drawing; what the user states stands above the file."""
    number = int(document.header.get("$INSUNITS", 0))
    its_name = _INSUNITS.get(number)
    if stated is not None:
        unit = _length_unit(stated)
        same = its_name is None or math.isclose(_length_unit(its_name).size, unit.size)
        if same:
            return unit, []
        return unit, [f"unit {stated} as stated; the drawing says {its_name}"]
    if its_name is None:
        raise InputError(
            "the drawing does not say its unit of length (it has no usable $INSUNITS); "
            'state it, such as unit = "mm".'
        )
    return _length_unit(its_name), []


def _length_unit(name: str) -> Unit:
    return parse_unit(name, "length")


def _take(document: Any, unit: Unit) -> tuple[list[Piece], list[str]]:
    """Pieces of everything that can bound a panel; what cannot, in words."""
    pieces: list[Piece] = []
    ignored: list[str] = []
    hidden = {
        layer.dxf.name.lower(): "frozen" if layer.is_frozen() else "off"
        for layer in document.layers
        if layer.is_off() or layer.is_frozen()
    }
    for number, entity in enumerate(document.modelspace()):
        kind, layer = entity.dxftype(), str(entity.dxf.get("layer", "0"))
        take = TAKEN.get(kind)
        if layer.lower() in hidden:
            ignored.append(
                f"{_name(entity, unit)}: its layer is {hidden[layer.lower()]}"
            )
        elif entity.dxf.get("invisible", 0):
            ignored.append(f"{_name(entity, unit)}: it is invisible")
        elif take is None or (kind == "POLYLINE" and not is_line(entity)):
            block = "a block, not taken apart; explode it if it is part of the panel"
            why = block if kind == "INSERT" else "no line"
            ignored.append(f"{_name(entity, unit)}: {why}")
        else:
            arcs = _arcs(entity, take, unit)
            if not arcs:
                ignored.append(f"{_name(entity, unit)}: without length")
            pieces += [
                Piece(
                    start=_scaled(start, unit),
                    end=_scaled(end, unit),
                    bulge=bulge,
                    kind=kind,
                    layer=layer,
                    entity=number,
                )
                for start, end, bulge in arcs
            ]
    return pieces, ignored


def _arcs(entity: Any, take: Callable[[Any], list[Arc]], unit: Unit) -> list[Arc]:
    """Pieces of an entity; says which it is where it is refused."""
    try:
        arcs = take(entity)
    except InputError as error:
        raise InputError(f"{_name(entity, unit)}: {error}") from error
    except Exception as error:  # ezdxf lets pass what its parts raise
        raise InputError(f"{_name(entity, unit)} is damaged; draw it again.") from error
    numbers = [c for start, end, bulge in arcs for c in (*start, *end, bulge)]
    if not all(math.isfinite(number) for number in numbers):
        raise InputError(
            f"{_name(entity, unit)} has coordinates that are no numbers; draw it again."
        )
    return arcs


def _scaled(point: Point, unit: Unit) -> Point:
    return point[0] * unit.size, point[1] * unit.size


def _name(entity: Any, unit: Unit) -> str:
    """Kind and layer of an entity, and where it or its lower left corner lies."""
    from ezdxf.bbox import extents

    layer = str(entity.dxf.get("layer", "0"))
    name, point = f"{entity.dxftype()} on layer {layer!r}", None
    for key in ("insert", "location", "center", "start", "defpoint", "vtx0"):
        if entity.dxf.hasattr(key):
            point = entity.dxf.get(key)
            break
    else:
        # A damaged entity has no box.
        with contextlib.suppress(Exception):
            box = extents([entity], fast=True)
            point = box.extmin if box.has_data else None
    if point is None:
        return name
    return f"{name} at {place(_scaled((point[0], point[1]), unit), unit)}"


def _choose(
    pieces: list[Piece],
    layer: str | Sequence[str] | None,
    unit: Unit,
    snap: float | None,
) -> tuple[list[Piece], list[Piece], list[str]]:
    """Part the pieces into those of the panel and the rest; notes of the choice."""
    layers: dict[str, list[Piece]] = {}
    for piece in pieces:
        layers.setdefault(piece.layer.lower(), []).append(piece)
    if layer is not None:
        names = [layer] if isinstance(layer, str) else list(layer)
        return *_of_layers(pieces, layers, names), []
    if len(layers) < 2:
        return pieces, [], []
    closed = {name: closed_lines(own, snap=snap) for name, own in layers.items()}
    holding = [name for name, number in closed.items() if number]
    if not holding:
        return pieces, [], []
    own = layers[holding[0]]
    others = [piece for piece in pieces if piece.layer.lower() != holding[0]]
    if len(holding) > 1 or _sticks_out(own, others):
        listed = ", ".join(
            f"{layers[name][0].layer!r} ({count(closed[name], 'closed line')})"
            for name in sorted(layers)
        )
        raise InputError(
            f"the panel may be on several layers: {listed}; choose the layer, or the "
            "layers, that it is drawn on."
        )
    note = f"layer {own[0].layer!r} taken: no other holds closed lines"
    return own, others, [note]


def _of_layers(
    pieces: list[Piece], layers: dict[str, list[Piece]], names: Sequence[str]
) -> tuple[list[Piece], list[Piece]]:
    """Pieces on the layers that were asked for, and the others."""
    wanted = {name.lower() for name in names}
    for name in names:
        if name.lower() not in layers:
            have = ", ".join(repr(own[0].layer) for _, own in sorted(layers.items()))
            raise InputError(
                f"layer {name!r} holds no lines or arcs; "
                f"{'those that do are ' + have if have else 'no layer does'}."
            )
    own = [piece for piece in pieces if piece.layer.lower() in wanted]
    return own, [piece for piece in pieces if piece.layer.lower() not in wanted]


def _sticks_out(own: Sequence[Piece], others: Sequence[Piece]) -> bool:
    """Whether lines lie farther outside others than centre lines do."""
    inner, outer = (np.concatenate(arrays(group)[:2]) for group in (own, others))
    low, high = inner.min(axis=0), inner.max(axis=0)
    reach = STICK_OUT * float(np.hypot(*(high - low)))
    return bool(((outer < low - reach) | (outer > high + reach)).any())
