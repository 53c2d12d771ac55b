"""Every public name says what it takes, gives and refuses, section by section."""

import dataclasses
import inspect
import re

import pytest

import kplate as kp

PUBLIC = {name: getattr(kp, name) for name in kp.__all__}
CALLABLE = [
    name
    for name, own in PUBLIC.items()
    if inspect.isclass(own) or inspect.isfunction(own)
]
# Names of values (CLAMPED, STEEL, ...) and of types put together (Goal) carry none.
VALUES = [name for name in PUBLIC if name not in CALLABLE]


UNITS = re.compile(
    r"\b(m|m2|N|Pa|J|kg/m3|rad|N/m|N/m3|m/s2|share|shares|ratio|units|times|unit|factor|over)\b",
    re.IGNORECASE,
)


def has(doc, section):
    return re.search(rf"^{section}\n-{{{len(section)}}}$", doc, re.MULTILINE)


def methods(own):
    """Public functions and properties that a class defines itself."""
    for name, member in vars(own).items():
        inner = member.fget if isinstance(member, property) else member
        inner = getattr(inner, "func", getattr(inner, "__func__", inner))
        if inspect.isfunction(inner) and not name.startswith("_"):
            yield name, inner


def documented(doc, field):
    """Whether a field stands as "name :" or among several before a colon."""
    return re.search(rf"^(\*?\w+, )*\*?{field}(, \*?\w+)*( :|$)", doc, re.MULTILINE)


def missing(doc, function):
    """What the docstring of a function with parameters lacks."""
    signature = inspect.signature(function)
    names = [name for name in signature.parameters if name not in ("self", "cls")]
    lacks = [name for name in names if not documented(doc, name)]
    if names and not has(doc, "Parameters"):
        lacks.append("Parameters")
    gives = signature.return_annotation not in (None, "None", inspect.Signature.empty)
    if gives and not (has(doc, "Returns") or has(doc, "Yields")):
        lacks.append("Returns")
    return lacks


@pytest.mark.parametrize("name", CALLABLE)
def test_a_public_name_documents_what_it_takes_and_gives(name):
    own = PUBLIC[name]
    doc = inspect.getdoc(own)
    assert doc
    assert doc.splitlines()[0].endswith("."), doc.splitlines()[0]
    if inspect.isfunction(own):
        assert not missing(doc, own)
    elif dataclasses.is_dataclass(own):
        fields = [
            f.name for f in dataclasses.fields(own) if f.init and f.name[0] != "_"
        ]
        assert not fields or has(doc, "Parameters")
        assert not [field for field in fields if not documented(doc, field)]


@pytest.mark.parametrize("name", CALLABLE)
def test_a_public_name_says_what_it_raises(name):
    own = PUBLIC[name]
    found = [(name, own)] if inspect.isfunction(own) else list(methods(own))
    for member, function in found:
        doc = inspect.getdoc(function)
        assert doc, member
        if "raise InputError" in inspect.getsource(function):
            assert has(doc, "Raises"), member
    checks = vars(own).get("__post_init__")
    if checks is not None and "raise InputError" in inspect.getsource(checks):
        assert has(inspect.getdoc(own), "Raises")


@pytest.mark.parametrize("name", CALLABLE)
def test_numbers_carry_their_units(name):
    """Whatever is a plain number of a physical kind names its unit."""
    own = PUBLIC[name]
    if not dataclasses.is_dataclass(own):
        return
    doc = inspect.getdoc(own)
    for field in dataclasses.fields(own):
        if field.init and field.type in ("float", float):
            stated = re.search(
                rf"^.*\b{field.name}\b.* : .*\n((?:    .*\n?)+)", doc, re.MULTILINE
            )
            assert UNITS.search(stated[1]), (field.name, stated[1])


def test_the_names_without_docstrings_are_values_and_types():
    assert set(VALUES) >= {"CLAMPED", "FREE", "STEEL", "STOCK", "Goal"}
    for name in VALUES:
        own = PUBLIC[name]
        assert name.isupper() or name == "Goal", own


def test_every_public_name_stands_once_and_in_order():
    assert len(set(kp.__all__)) == len(kp.__all__)
    capitals = [name for name in kp.__all__ if name.isupper()]
    others = [name for name in kp.__all__ if not name.isupper()]
    classes = [name for name in others if name[0].isupper()]
    functions = [name for name in others if name[0].islower()]
    assert list(kp.__all__) == [*capitals, *classes, *functions]
    for names in (capitals, classes, functions):
        assert names == sorted(names)
