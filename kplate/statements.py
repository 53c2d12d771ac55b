"""Materials, zones and supports of a panel file, in SI units.

Every quantity is text with its unit. A field of a later version is refused by its name.
"""

from collections.abc import Mapping, Sequence
from typing import Any

from kplate.errors import InputError
from kplate.fields import Fields, closest, numbered, refuse_later, shown, some, within
from kplate.materials import STOCK, Isotropic
from kplate.outline import Outline
from kplate.plate import Section
from kplate.supports import SUPPORTS, Support

# What each table may hold, each field with a value as it is written.
MATERIAL = {
    "name": '"larch board"',
    "E": '"11 GPa"',
    "nu": "0.3",
    "density": '"590 kg/m^3"',
    "source": '"data sheet"',
}
# The fields of a [[zone]] that say what it is made of; the rest says where it is.
SECTION = {"thickness": '"20 mm"', "material": '"steel S355"'}
# What the panel file is to hold one day.
LATER_SIDES = ("bedding",)
LATER_SUPPORTS = ("springs",)


def read_material(section: Fields) -> Isotropic:
    """Material of a section: one from stock by its name, or a table of its own."""
    stated = section.value("material")
    if not isinstance(stated, Mapping):
        return STOCK[section.choice("material", STOCK)]
    fields = Fields(where=f"{section.where} material", table=stated, examples=MATERIAL)
    density = fields.positive("density", "density") if "density" in fields else None
    name, nu = fields.word("name"), fields.number("nu")
    E = fields.positive("E", "stress")
    source = fields.word("source", default="")
    with within(section.where):
        return Isotropic(name=name, E=E, nu=nu, density=density, source=source)


def read_zones(tables: Sequence[Mapping[str, Any]]) -> dict[str, Section]:
    """What zones are made of, by their names, which the outline has checked."""
    sections = {}
    for i, table in enumerate(tables, 1):
        own = {key: table[key] for key in SECTION if key in table}
        where = numbered("[[zone]]", i, table)
        fields = Fields(where=where, table=own, examples=SECTION)
        sections[table["name"]] = Section(
            thickness=(
                fields.positive("thickness", "length") if "thickness" in own else None
            ),
            material=read_material(fields) if "material" in own else None,
        )
    return sections


def read_supports(table: Mapping[str, Any], outline: Outline) -> dict[str, Support]:
    """How each side, seam and mark that is named is held."""
    names = outline.names
    refuse_later("[supports]", table, set(LATER_SIDES).difference(names))
    supports = {}
    for name, word in table.items():
        place = f"[supports] {shown(name)} = {shown(word)}"
        if name not in names:
            raise InputError(
                f"{place}: there is no such side, seam or mark; the names are "
                f"{some(names)}.{closest(name, names)}"
            )
        if isinstance(word, Mapping) or word in LATER_SUPPORTS:
            raise InputError(
                f"{place}: such a support is not read by this version; use one "
                f"of {', '.join(SUPPORTS)}."
            )
        if not isinstance(word, str) or word not in SUPPORTS:
            hint = closest(word, SUPPORTS) if isinstance(word, str) else ""
            raise InputError(f"{place}: it must be one of {', '.join(SUPPORTS)}.{hint}")
        supports[name] = SUPPORTS[word]
    return supports
