"""What is known of each case: reference_static.json and one short file each in own/.

A record states a plate, its load and numbers, each with what it is a coefficient of, a
value computed without finite elements where there is one, and figures in print. All is
scaled to D = 1, in kplate's signs; DEVELOPERS.md shows how to add one.
"""

import json
import tomllib
from collections.abc import Iterable
from dataclasses import dataclass
from decimal import Decimal
from difflib import get_close_matches
from functools import cache
from pathlib import Path
from typing import Any

from kplate.errors import InputError

FILE = Path(__file__).with_name("reference_static.json")
OWN = Path(__file__).with_name("own")

NEEDED = ("title", "family", "outline", "supports", "load", "nu", "quantities")
ALLOWED = {*NEEDED, "note", "holes", "zones", "seams", "marks"}
QUANTITIES = (
    "deflection", "moment", "m_xx", "m_yy", "m_xy", "m_1", "m_2", "shear",
    "line reaction", "corner force", "point reaction",
)  # fmt: skip
OF_NUMBER = {
    "quantity", "at", "place", "coefficient", "normal", "toward", "value", "digits",
    "method", "published", "publication", "from_memory", "rounding", "also",
}  # fmt: skip
# Quantities that handbooks count along the load, kplate up; every load here acts down.
TURNED = ("deflection", "corner force")


@dataclass(frozen=True, kw_only=True)
class Figure:
    """A number in print.

    Parameters
    ----------
    published : float
        As printed, in kplate's signs.
    half_unit : float
        Half a unit of its last printed digit.
    publication : str
        Where, the book by its short name (`publications` of the reference file).
    from_memory : bool
        Whether it was recalled, not looked up.
    """

    published: float
    half_unit: float
    publication: str
    from_memory: bool

    @property
    def words(self) -> str:
        """Where it is printed, marked where recalled."""
        return self.publication + " (from memory)" * self.from_memory

    def holds(self, number: float, width: float = 0.0) -> bool:
        """Whether a number rounds to it, to within a width."""
        room = self.half_unit * (1.0 + 1e-9) + width
        return abs(number - self.published) <= room


@cache
def reference() -> dict[str, Any]:
    """Contents of the reference file."""
    data: dict[str, Any] = json.loads(FILE.read_text("utf-8"))
    return data


@cache
def records() -> tuple[dict[str, Any], ...]:
    """All records: those of the reference file, then those in own/."""
    own = (read(path) for path in sorted(OWN.glob("*.toml")))
    return (*reference()["records"], *own)


def record(name: str) -> dict[str, Any]:
    """Return the record of this name.

    Raises
    ------
    InputError
        If there is none.
    """
    for own in records():
        if own["id"] == name:
            return own
    close = get_close_matches(name, [own["id"] for own in records()])
    hint = f"did you mean {', '.join(close)}?" if close else "--list shows them all."
    raise InputError(f"there is no case {name!r}; {hint}")


def families() -> tuple[str, ...]:
    """Names of the families, in the order of the file."""
    return tuple(dict.fromkeys(own["family"] for own in records()))


def chosen(names: Iterable[str], family: str | None) -> list[dict[str, Any]]:
    """Records of these names, or of a family, or all."""
    if family is not None and family not in families():
        raise InputError(
            f"there is no family {family!r}; the families are {', '.join(families())}."
        )
    wanted = [record(name) for name in names] or list(records())
    return [own for own in wanted if family in (None, own["family"])]


def read(path: Path) -> dict[str, Any]:
    """Read the record of a file; its name is the file's.

    Raises
    ------
    InputError
        If something is missing, unknown or not what it should be.
    """
    try:
        data = tomllib.loads(path.read_text("utf-8"))
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise InputError(f"{path.name} is no TOML: {error}.") from error
    for key in NEEDED:
        if key not in data:
            raise InputError(f"{path.name} has no {key!r}; see DEVELOPERS.md.")
    _check_keys(path.name, data, ALLOWED)
    for number, item in enumerate(data["quantities"], start=1):
        _check_number(f"{path.name}, number {number}", item)
    return {"id": path.stem, "holes": [], **data}


def figures(item: dict[str, Any]) -> list[Figure]:
    """Figures in print of a number, the first the one it is judged by."""
    stated = [item, *item.get("also", ())]
    return [_figure(own) for own in stated if own.get("published") is not None]


def method(item: dict[str, Any]) -> str:
    """How the value of a number was computed."""
    if "source" in item:
        words: str = reference()["sources"][item["source"]]
        return words
    return str(item.get("method", "none known"))


def method_name(item: dict[str, Any]) -> str:
    """Short name of that method."""
    return str(item.get("source") or item.get("method", "none known"))


def sign(item: dict[str, Any]) -> float:
    """1, or -1 for what handbooks count the other way round."""
    return -1.0 if item["quantity"] in TURNED else 1.0


def _figure(stated: dict[str, Any]) -> Figure:
    printed = stated["published"]
    return Figure(
        published=float(printed),
        half_unit=stated.get("rounding", _half_unit(printed)),
        publication=stated.get("publication") or "",
        from_memory=bool(stated.get("from_memory")),
    )


def _half_unit(printed: float | str) -> float:
    """Half a unit of the last digit; a text keeps its zeros at the end."""
    exponent = Decimal(str(printed)).as_tuple().exponent
    assert isinstance(exponent, int)
    if not isinstance(printed, str) and float(printed).is_integer():
        exponent = 0
    return 0.5 * 10.0**exponent


def _check_keys(where: str, stated: dict[str, Any], allowed: Iterable[str]) -> None:
    for key in stated:
        if key not in allowed:
            raise InputError(
                f"{where} has {key!r}, which is not read; it may hold "
                f"{', '.join(sorted(allowed))}."
            )


def _check_number(where: str, item: dict[str, Any]) -> None:
    _check_keys(where, item, OF_NUMBER)
    for key in ("quantity", "at", "place", "coefficient"):
        if key not in item:
            raise InputError(f"{where} has no {key!r}; see DEVELOPERS.md.")
    if item["quantity"] not in QUANTITIES:
        raise InputError(
            f"{where}: there is no quantity {item['quantity']!r}; the quantities are "
            f"{', '.join(QUANTITIES)}."
        )
    if ("normal" in item) != (item["quantity"] in ("moment", "shear")):
        raise InputError(f"{where}: a moment and a shear have a 'normal', no other.")
    if "value" in item and not {"digits", "method"} <= set(item):
        raise InputError(f"{where} has a value; give its 'digits' and 'method'.")
    if "value" not in item and item.get("published") is None:
        raise InputError(f"{where} has neither a value nor a published figure.")
    if item.get("published") is not None and not item.get("publication"):
        raise InputError(f"{where} has a published figure; say in which 'publication'.")
