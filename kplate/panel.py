"""The panel file: one TOML text that states a panel, its load cases and its limits.

What a file says and this version does not read is refused, never skipped.
"""

import hashlib
import math
import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from kplate.asking import Ask
from kplate.caseloads import read_cases
from kplate.choice import AUTO
from kplate.combinationfields import idle_cases, read_asks, read_combinations
from kplate.combinations import Combination
from kplate.elements import ELEMENTS
from kplate.errors import InputError
from kplate.fields import Fields, closest, shown, within
from kplate.judging import check_limits
from kplate.limitfields import read_allowances, read_limits
from kplate.limits import Limit
from kplate.loads import Case
from kplate.outline import Outline
from kplate.outlines import read_outline
from kplate.patches import Roaming
from kplate.plate import Plate
from kplate.quantities import share, unit
from kplate.statements import (
    read_material,
    read_supports,
    read_zones,
)
from kplate.units import DisplayUnits, Unit

MOST_TRIANGLES = 10_000_000  # beyond, the memory of a large machine is gone
MOST_BYTES = 50_000_000  # a longer file is no text that somebody wrote

SECTIONS = {
    "panel": "[panel]",
    "outline": "[outline]",
    "hole": "[[hole]]",
    "zone": "[[zone]]",
    "seam": "[[seam]]",
    "mark": "[[mark]]",
    "supports": "[supports]",
    "case": "[[case]]",
    "combination": "[[combination]]",
    "limits": "[limits]",
    "ask": "[[ask]]",
}
NEEDED = ("panel", "outline", "case")
# The fields of [panel], each with a value as it is written.
PANEL = {
    "name": '"pit cover"',
    "revision": '"A"',
    "author": '"J. Bloggs"',
    "thickness": '"10 mm"',
    "material": '"steel S235"',
    "tolerance": '"1 %"',
    "held in plane": '"no"',
    "triangles": "20000",
    "element": '"auto"',
    "design moments": '"no"',
}


@dataclass(frozen=True, eq=False, kw_only=True)
class Panel:
    """A panel file as it was understood.

    Parameters
    ----------
    name, revision, author : str
        Who the panel is; the last two may be empty.
    plate : Plate
        Outline, thickness, material and supports.
    cases : tuple of Case
        The load cases, each name once.
    roaming : tuple of Roaming
        Cases with a patch that roams, which `kplate.placing` turns into load cases.
    combinations : tuple of Combination
        Factors on the cases; empty where each case is judged for itself.
    limits : tuple of Limit
        What the panel is judged by.
    asks : tuple of Ask
        Points and lines where values are wanted.
    tolerance : float, optional
        Width of the bands asked for, as a share.
    held_in_plane : bool, optional
        Whether the edges are held in the plane of the plate.
    triangles : int, optional
        How many triangles to mesh with, instead of meshing to the tolerance.
    element : str
        Name of the element, or "auto".
    design : bool
        Whether design moments of reinforcement are wanted.
    stock : tuple of float
        Thicknesses to choose from in m, as listed; empty where none are stated.
    under_tolerance, corrosion : float
        What may be missing of a thickness of the stock in m, as it comes and later.
    units : DisplayUnits
        The units to show it in, from those of the file.
    notes : tuple of str
        What was tidied in the outline, and what a drawing holds that was not taken.
    path : Path
        The file.
    digest : str
        First 8 hexadecimal digits of the SHA-256 of its bytes, followed by those of the
        drawing that it names, if any.
    """

    name: str
    revision: str
    author: str
    plate: Plate
    cases: tuple[Case, ...]
    roaming: tuple[Roaming, ...]
    combinations: tuple[Combination, ...]
    limits: tuple[Limit, ...]
    asks: tuple[Ask, ...]
    tolerance: float | None
    held_in_plane: bool | None
    triangles: int | None
    element: str
    design: bool
    stock: tuple[float, ...]
    under_tolerance: float
    corrosion: float
    units: DisplayUnits
    notes: tuple[str, ...]
    path: Path
    digest: str


def read_panel(path: Path) -> Panel:
    """Read a panel file.

    Parameters
    ----------
    path : Path
        A TOML file in UTF-8; ``kplate/starter.toml`` shows every section.

    Returns
    -------
    Panel
        What it states, in SI units.

    Raises
    ------
    InputError
        If the file cannot be read, or anything in it is missing, unknown, wrong or
        not read by this version; the message names the field.

    Warns
    -----
    KplateWarning
        If a number stands but is unusual, such as a Young's modulus below 0.1 GPa.
    """
    path = Path(path)
    content = _content(path)
    sections = _sections(_table(content, path))
    head = Fields(where="[panel]", table=sections["panel"], examples=PANEL)
    stated = read_outline(sections, path.parent)
    plate = _plate(head, sections, stated.outline)
    cases, roaming = read_cases(sections["case"], plate)
    if roaming and "combination" in sections:
        raise InputError(
            f"case {roaming[0].name!r} roams, and there are combinations: where it "
            "governs would depend on them. State what acts at the same time as the "
            "loads of that case, and take [[combination]] out."
        )
    combinations = read_combinations(sections.get("combination", []), cases)
    limits, stock, stress = read_limits(sections.get("limits", {}), plate)
    with within("[limits]"):
        check_limits(plate, limits, combinations)
    under_tolerance, corrosion = read_allowances(sections.get("limits", {}))
    return Panel(
        name=head.word("name"),
        revision=head.word("revision", default=""),
        author=head.word("author", default=""),
        plate=plate,
        cases=cases,
        roaming=roaming,
        combinations=combinations,
        limits=limits,
        asks=read_asks(sections.get("ask", []), plate.outline, stated.length),
        tolerance=_tolerance(head),
        held_in_plane=_held_in_plane(head),
        triangles=_triangles(head),
        element=_element(head),
        design=_design(head),
        stock=stock,
        under_tolerance=under_tolerance,
        corrosion=corrosion,
        units=_display_units(stated.length, stress),
        notes=(*stated.notes, *idle_cases(cases, combinations)),
        path=path,
        digest=_digest(content, stated.file),
    )


def _plate(head: Fields, sections: dict[str, Any], outline: Outline) -> Plate:
    """Plate of a panel file."""
    thickness, material = head.positive("thickness", "length"), read_material(head)
    zones = read_zones(sections.get("zone", []))
    supports = read_supports(sections.get("supports", {}), outline)
    with within("[supports]"):
        return Plate(
            outline=outline,
            thickness=thickness,
            material=material,
            supports=supports,
            zones=zones,
        )


def _digest(content: bytes, drawing: Path | None) -> str:
    """Short hash of the panel file, and of the drawing that it names."""
    whole = hashlib.sha256(content)
    if drawing is not None:
        whole.update(drawing.read_bytes())
    return whole.hexdigest()[:8]


def _content(path: Path) -> bytes:
    """Read the bytes of the file."""
    shown_path = repr(str(path))
    try:
        if path.is_dir():
            raise InputError(f"{shown_path} is a folder; name a panel file (TOML).")
        with path.open("rb") as file:
            content = file.read(MOST_BYTES + 1)
    except (OSError, ValueError) as error:
        if isinstance(error, InputError):
            raise
        why = getattr(error, "strerror", None) or error
        raise InputError(f"cannot read panel file {shown_path}: {why}.") from error
    if len(content) > MOST_BYTES:
        raise InputError(
            f"{shown_path} is longer than {MOST_BYTES // 10**6} MB; name a panel file."
        )
    return content


def _table(content: bytes, path: Path) -> dict[str, Any]:
    """Read the bytes as TOML."""
    shown_path = repr(str(path))
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        raise InputError(
            f"{shown_path} is not UTF-8 text (byte {content[error.start]:#04x} in line "
            f"{line}); save it as UTF-8."
        ) from error
    try:
        return tomllib.loads(text)
    except RecursionError as error:
        raise InputError(f"{shown_path} nests its values too deeply.") from error
    except ValueError as error:  # bad TOML, or a number of thousands of digits
        why = " ".join(str(error).split())
        if len(why) > 120:
            why = f"{why[:60]} ... {why[-50:]}"
        hint = ""
        if re.search(r"^\s*held in plane", text, re.MULTILINE):
            hint = '; a name with spaces stands in quotes, "held in plane" = "no"'
        raise InputError(f"{shown_path} is not valid TOML: {why}{hint}.") from error


def _sections(table: dict[str, Any]) -> dict[str, Any]:
    """Check that the file holds the sections it may and must, as tables or lists."""
    for key, value in table.items():
        if key not in SECTIONS:
            raise InputError(
                f"unknown section {shown(key)}; the sections are "
                f"{', '.join(SECTIONS.values())}.{closest(key, SECTIONS)}"
            )
        header = SECTIONS[key]
        is_list = isinstance(value, list) and value and header.startswith("[[")
        if not (is_list or (isinstance(value, Mapping) and header[1] != "[")):
            raise InputError(
                f"section {key!r} is {shown(value)}; start it with the line {header}."
            )
    for key in NEEDED:
        if key not in table:
            raise InputError(f"section {SECTIONS[key]} is missing; add it.")
    return table


def _tolerance(head: Fields) -> float | None:
    """Width of the bands asked for."""
    if "tolerance" not in head:
        return None
    with within(head.place("tolerance")):
        return share(head.value("tolerance"))


def _held_in_plane(head: Fields) -> bool | None:
    """Whether the edges are held in the plane, if the file says so."""
    if "held in plane" not in head:
        return None
    return head.choice("held in plane", ("yes", "no")) == "yes"


def _triangles(head: Fields) -> int | None:
    """Read the number of triangles, if the file states one."""
    if "triangles" not in head:
        return None
    count = head.value("triangles")
    if isinstance(count, bool) or not isinstance(count, int):
        raise head.refuse("triangles", "it must be a whole number, without quotes.")
    if not 1 <= count <= MOST_TRIANGLES:
        raise head.refuse("triangles", f"it must lie between 1 and {MOST_TRIANGLES}.")
    return count


def _element(head: Fields) -> str:
    """Name of the element; the one that suits the plate where the file has none."""
    if "element" not in head:
        return AUTO
    return head.choice("element", (AUTO, *ELEMENTS))


def _design(head: Fields) -> bool:
    """Whether design moments of reinforcement are wanted."""
    wanted = "design moments" in head
    return wanted and head.choice("design moments", ("yes", "no")) == "yes"


def _display_units(length: Unit, stress: Unit | None) -> DisplayUnits:
    """Units to show the panel in: American ones if the outline is in feet or inches."""
    decades = math.log10(length.size)
    if abs(decades - round(decades)) < 1e-9:
        return DisplayUnits(length=length, stress=stress or DisplayUnits.stress)
    return DisplayUnits(
        length=length,
        deflection=unit("in", "length"),
        force=unit("lbf", "force"),
        line_force=Unit(
            "lbf/in", unit("lbf", "force").size / unit("in", "length").size
        ),
        moment=unit("lbf", "force"),
        pressure=unit("psi", "pressure"),
        stress=stress or unit("psi", "pressure"),
    )
