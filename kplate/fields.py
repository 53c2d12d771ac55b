"""The fields of one table of a panel file, each complaint naming the field.

A message reads ``[panel] thickness = '10': a length needs a unit, such as "10 mm".``
"""

import difflib
from collections.abc import Collection, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any

from kplate.errors import InputError
from kplate.quantities import (
    MOST_TEXT,
    angle,
    bare_number,
    check_reach,
    directed,
    length,
    positive,
    quantity,
    unit,
)
from kplate.units import Unit


@dataclass(frozen=True, kw_only=True)
class Fields:
    """One table of a panel file.

    Parameters
    ----------
    where : str
        How messages name the table, such as "[panel]".
    table : mapping
        What it holds.
    examples : mapping of str to str
        The fields it may hold, each with a value as it is written.

    Raises
    ------
    InputError
        If it is not a table, or holds a field that it may not.
    """

    where: str
    table: Mapping[str, Any]
    examples: Mapping[str, str]

    def __post_init__(self) -> None:
        """Check the names of the fields."""
        if not isinstance(self.table, Mapping):
            field, example = next(iter(self.examples.items()))
            raise InputError(
                f"{self.where} is {shown(self.table)}; it must be a table such as "
                f"{{ {field} = {example} }}."
            )
        for key in self.table:
            if key not in self.examples:
                raise InputError(
                    f"{self.where}: unknown field {shown(key)}; the fields are "
                    f"{', '.join(self.examples)}.{closest(key, self.examples)}"
                )

    def __contains__(self, key: str) -> bool:
        """Whether the field is stated."""
        return key in self.table

    def value(self, key: str) -> Any:
        """Return what a field holds, which must be there."""
        if key not in self.table:
            raise InputError(
                f"{self.where}: {key} is missing; add {key} = {self.examples[key]}."
            )
        return self.table[key]

    def place(self, key: str) -> str:
        """Say how a message names a field and its value."""
        return f"{self._path(key)} = {shown(self.value(key))}"

    def refuse(self, key: str, why: str) -> InputError:
        """Return the complaint about a field."""
        return InputError(f"{self.place(key)}: {why}")

    def word(self, key: str, *, default: str | None = None) -> str:
        """Return text on one line, such as a name."""
        if default is not None and key not in self.table:
            return default
        with within(self.place(key)):
            return one_line(self.value(key))

    def choice(self, key: str, words: Collection[str]) -> str:
        """Return one of some words."""
        value = self.value(key)
        if isinstance(value, str) and value in words:
            return value
        hint = closest(value, words) if isinstance(value, str) else ""
        raise self.refuse(key, f"it must be one of {', '.join(words)}.{hint}")

    def number(self, key: str) -> float:
        """Return a number without a unit."""
        with within(self.place(key)):
            return bare_number(self.value(key))

    def quantity(self, key: str, dimension: str) -> float:
        """Return a quantity in SI units, with its sign."""
        with within(self.place(key)):
            return quantity(self.value(key), dimension)

    def positive(self, key: str, dimension: str) -> float:
        """Return a quantity in SI units, larger than zero."""
        with within(self.place(key)):
            return positive(self.value(key), dimension)

    def directed(self, key: str, dimension: str) -> float:
        """Return a load in SI units, positive up."""
        with within(self.place(key)):
            return directed(self.value(key), dimension)

    def length(self, key: str, plain: Unit) -> float:
        """Return a size in m, larger than zero; a plain number is of this unit."""
        with within(self.place(key)):
            size = length(self.value(key), plain)
            if size <= 0.0:
                raise InputError("it must be a positive length.")
            check_reach(size, "length")
            return size

    def pair(self, key: str, plain: Unit) -> tuple[float, float]:
        """Return a place in m; plain numbers are of this unit."""
        with within(self.place(key)):
            return pair(self.value(key), plain)

    def angle(self, key: str) -> float:
        """Return an angle in rad, 0 where the field is left out."""
        if key not in self.table:
            return 0.0
        with within(self.place(key)):
            return angle(self.value(key))

    def unit(self, key: str, dimension: str) -> Unit:
        """Return a unit that the file names."""
        with within(self.place(key)):
            return unit(one_line(self.value(key)), dimension)

    def items(self, key: str) -> list[tuple[str, Any]]:
        """Return the items of a list, each with how messages name it."""
        value = self.value(key)
        if not isinstance(value, list) or not value:
            raise self.refuse(
                key, f"it must be a list with entries, such as {self.examples[key]}."
            )
        return [
            (f"{self._path(key)}, item {i} = {shown(item)}", item)
            for i, item in enumerate(value, 1)
        ]

    def words(self, key: str) -> list[str]:
        """Return the items of a list of names."""
        names = []
        for place, item in self.items(key):
            with within(place):
                names.append(one_line(item))
        return names

    def tables(self, key: str, examples: Mapping[str, str]) -> "list[Fields]":
        """Return the items of a list of tables, each with its own fields."""
        count = len(self.items(key))
        return [self.row(key, i, examples) for i in range(1, count + 1)]

    def row(self, key: str, number: int, examples: Mapping[str, str]) -> "Fields":
        """Return one item of a list, the first is 1, as a table."""
        where = f"{self._path(key)}, item {number}"
        item = self.value(key)[number - 1]
        return Fields(where=where, table=item, examples=examples)

    def _path(self, key: str) -> str:
        gap = " " if self.where.endswith("]") else ": "
        return f"{self.where}{gap}{key}"


def pair(value: object, plain: Unit) -> tuple[float, float]:
    """Check two coordinates; return them in m."""
    if not isinstance(value, list) or len(value) != 2:
        raise InputError("a place is two numbers [x, y] in the outline's unit.")
    return length(value[0], plain), length(value[1], plain)


def one_line(value: object) -> str:
    """Check text that goes into tables."""
    if not isinstance(value, str):
        raise InputError("it must be text in quotes.")
    if not value or value != value.strip() or not value.isprintable():
        raise InputError(
            "it must be text on one line, not empty, with no space around it."
        )
    if len(value) > MOST_TEXT:
        raise InputError(f"it is longer than {MOST_TEXT} characters.")
    return value


@contextmanager
def within(where: str) -> Iterator[None]:
    """Name the place in the file in each complaint raised inside."""
    try:
        yield
    except InputError as error:
        raise InputError(f"{where}: {error}") from error


def shown(value: object) -> str:
    """Show a value of the file in a message, on one short line."""
    match value:
        case bool():
            return str(value).lower()
        case str():
            return repr(value if len(value) <= 40 else f"{value[:37]}...")
        case int() if abs(value) >= 10**15:
            return "a huge integer"
        case [*items] if items and len(items) <= 3 and all(map(_is_plain, items)):
            return f"[{', '.join(map(shown, items))}]"
        case Mapping():
            return "a table"
        case Sequence():
            return f"a list of {len(value)}" if value else "an empty list"
    return str(value)


def closest(word: str, words: Collection[str]) -> str:
    """Ask whether the nearest of some words was meant, if one is near."""
    close = difflib.get_close_matches(word[:MOST_TEXT], list(words), n=1)
    return f" Did you mean {close[0]!r}?" if close else ""


def some(names: Collection[str]) -> str:
    """List names, but no more than a line holds."""
    first = list(names)[:8]
    more = len(names) - len(first)
    return ", ".join(map(shown, first)) + (f" and {more} more" if more else "")


def numbered(section: str, number: int, table: Any) -> str:
    """Say how messages name one of several tables: by its number and its name."""
    name = table.get("name") if isinstance(table, Mapping) else None
    return f"{section} {number}" + (f" {shown(name)}" if isinstance(name, str) else "")


def named(fields: Fields, key: str, names: Collection[str], what: str) -> str:
    """Return the name of something that is there."""
    name = fields.word(key)
    if name in names:
        return name
    there = f"the names are {some(names)}" if names else "there is none"
    raise fields.refuse(key, f"there is no such {what}; {there}.{closest(name, names)}")


def several(fields: Fields, key: str, examples: Mapping[str, str]) -> list[Fields]:
    """Return the tables of a field that holds one or a list of them."""
    if isinstance(fields.value(key), list):
        return fields.tables(key, examples)
    where = f"{fields.where} {key}"
    return [Fields(where=where, table=fields.value(key), examples=examples)]


def refuse_later(where: str, table: Mapping[str, Any], later: Collection[str]) -> None:
    """Refuse fields that this version does not read yet."""
    for key in table:
        if key in later:
            raise InputError(f"{where} {key} is not read by this version; take it out.")


def refuse_beside(fields: Fields, key: str, others: Collection[str]) -> None:
    """Refuse fields that say twice what one field says."""
    for other in others:
        if other in fields:
            raise InputError(
                f"{fields.where}: {key} and {other} exclude each other; keep one."
            )


def _is_plain(value: object) -> bool:
    return not isinstance(value, list | dict)
