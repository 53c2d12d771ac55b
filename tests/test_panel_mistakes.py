"""Mistakes in panel files are named; nothing but a panel or a complaint comes."""

import re
import warnings
from functools import partial
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from panel_texts import BASE, RICH, SAMPLES, changed, read_text, with_load

from kplate.errors import InputError, KplateWarning
from kplate.panel import Panel, read_panel


@pytest.fixture
def read(tmp_path):
    return partial(read_text, tmp_path)


CASE_1 = "[[case]] 1 'wheel'"
LOAD_1 = f"{CASE_1}, load 1"
STRESS = 'stress = { criterion = "von Mises", strength = "235 MPa", factor = 1.5 }'


def with_limit(limit: str) -> str:
    return changed("[limits]", f"[limits]\n{limit}")


def with_combination(text: str) -> str:
    return changed("[limits]", f"[[combination]]\n{text}\n\n[limits]")


def with_ask(text: str) -> str:
    return f"{BASE}\n[[ask]]\n{text}\n"


NAMES = "the names are 'south', 'east', 'north', 'west'."
HEAD_FIELDS = (
    "name, revision, author, thickness, material, tolerance, held in plane, triangles, "
    "element, design moments"
)
MISTAKES = [
    (
        changed('"10 mm"', '"10"'),
        "[panel] thickness = '10': a length needs a unit, such as \"10 mm\".",
    ),
    (
        changed('"10 mm"', "10"),
        '[panel] thickness = 10: a length is text with its unit, such as "10 mm".',
    ),
    (
        changed('"10 mm"', "true"),
        '[panel] thickness = true: a length is text with its unit, such as "10 mm".',
    ),
    (
        changed('"10 mm"', '"1,5 mm"'),
        "[panel] thickness = '1,5 mm': write a decimal point and no commas, such as "
        "1.5.",
    ),
    (
        changed('"10 mm"', '"10 kPa"'),
        "[panel] thickness = '10 kPa': 'kPa' is no unit of length; write it such as "
        '"10 mm".',
    ),
    (
        changed('"10 mm"', '"10 mmm"'),
        "[panel] thickness = '10 mmm': there is no unit 'mmm'; write length such as "
        '"10 mm".',
    ),
    (
        changed('"10 mm"', '"0 mm"'),
        "[panel] thickness = '0 mm': it must be a positive length.",
    ),
    (
        changed('"10 mm"', '"nan mm"'),
        "[panel] thickness = 'nan mm': a length is a number and its unit, such as "
        '"10 mm".',
    ),
    (
        changed('"10 mm"', '"1e400 mm"'),
        "[panel] thickness = '1e400 mm': the length is too large for any panel.",
    ),
    (
        changed('thickness = "10 mm"\n', ""),
        '[panel]: thickness is missing; add thickness = "10 mm".',
    ),
    (
        changed("thickness", "thicknes"),
        f"[panel]: unknown field 'thicknes'; the fields are {HEAD_FIELDS}. "
        "Did you mean 'thickness'?",
    ),
    (
        changed('"lid"', '""'),
        "[panel] name = '': it must be text on one line, not empty, with no space "
        "around it.",
    ),
    (
        changed('"lid"', '"a\\u2028b"'),
        "[panel] name = 'a\\u2028b': it must be text on one line, not empty, with no "
        "space around it.",
    ),
    (
        changed('"lid"', f'"{"x" * 101}"'),
        f"[panel] name = '{'x' * 37}...': it is longer than 100 characters.",
    ),
    (
        changed('"lid"', f"0x{'f' * 5000}"),
        "[panel] name = a huge integer: it must be text in quotes.",
    ),
    (
        changed('"lid"', '"lid"\nrevision = 2'),
        "[panel] revision = 2: it must be text in quotes.",
    ),
    (
        changed('"lid"', '"lid"\n"held in plane" = true'),
        "[panel] held in plane = true: it must be one of yes, no.",
    ),
    (
        changed('"lid"', '"lid"\ntolerance = "0.01"'),
        "[panel] tolerance = '0.01': it must be a share between 0 and 100 %, such as "
        '"1 %".',
    ),
    (
        changed('"lid"', '"lid"\ntriangles = 2e4'),
        "[panel] triangles = 20000.0: it must be a whole number, without quotes.",
    ),
    (
        changed("steel S235", "steel S325"),
        "[panel] material = 'steel S325': it must be one of steel S235, steel S275, "
        "steel S355, stainless 1.4301, aluminium 5083, float glass. Did you mean "
        "'steel S355'?",
    ),
    (
        changed('"steel S235"', '{ name = "own", E = "11 mPa", nu = 0.3 }'),
        "[panel] material: E = '11 mPa': unit 'mPa' is a slip of the pen; did you mean "
        "MPa?",
    ),
    (
        changed('"steel S235"', '{ name = "own", E = "11 GPa", nu = 0.7 }'),
        "[panel]: material 'own': nu = 0.7; Poisson's ratio must lie between 0 and "
        "0.5.",
    ),
    (
        changed('"mm"', '"furlong per week"'),
        "[outline] unit = 'furlong per week': 'furlong per week' is no unit; write one "
        "such as m.",
    ),
    (
        changed(
            "[[0, 0], [800, 0], [800, 600], [0, 600]]",
            "[[0, 0], [1e-10, 0], [0, 1e-10]]",
        ),
        "[outline] points = a list of 3: the length is too small for any panel.",
    ),
    (
        changed("[800, 0]", "[800, nan]"),
        "[outline] points, item 2 = [800, nan]: it must be a finite number of a usual "
        "size.",
    ),
    (
        changed("[800, 0]", "[800, true]"),
        "[outline] points, item 2 = [800, true]: a length is a number in the "
        'outline\'s unit, or text with a unit of its own, such as "10 mm".',
    ),
    (
        changed("[800, 0]", "[800]"),
        "[outline] points, item 2 = [800]: a place is two numbers [x, y] in the "
        "outline's unit.",
    ),
    (
        changed(', "west"]', "]"),
        "[outline]: the polygon with side 'south' has 4 points and 3 side names; give "
        "one for each piece, from each point to the next.",
    ),
    (
        changed("sides =", "circle = { centre = [0, 0], radius = 3 }\nsides ="),
        "[outline]: circle and points exclude each other; keep one.",
    ),
    (
        changed("sides =", "arcs = 3\nsides ="),
        "[outline]: unknown field 'arcs'; the fields are unit, points, sides, chords, "
        "snap, circle, slot, rectangle, ellipse, file, layer, fillets, reliefs, parts, "
        "expect. Did you mean 'parts'?",
    ),
    (
        changed(
            "[supports]",
            "[[hole]]\ncircle = { centre = [0, 300], radius = 9 }\n[supports]",
        ),
        "[[hole]]: hole 1 ('hole-1') crosses or lies outside the outline near (0, "
        "0.309) m; "
        "a hole must lie strictly inside the plate. Move or shrink it, or cut the "
        "notch "
        "into the outline.",
    ),
    (
        changed(
            "[supports]",
            '[[hole]]\nname = "shaft"\ncircle = { centre = [9, 9] }\n[supports]',
        ),
        "[[hole]] 1 'shaft' circle: radius is missing; add radius = 50.",
    ),
    (
        changed('south = "clamped"', 'soth = "clamped"'),
        f"[supports] 'soth' = 'clamped': there is no such side, seam or mark; {NAMES} "
        "Did you mean 'south'?",
    ),
    (
        changed('"clamped"', '"camped"'),
        "[supports] 'south' = 'camped': it must be one of clamped, simply supported, "
        "free, guided. Did you mean 'clamped'?",
    ),
    (
        changed('"clamped"', '"springs"'),
        "[supports] 'south' = 'springs': such a support is not read by this version; "
        "use one of clamped, simply supported, free, guided.",
    ),
    (
        changed('south = "clamped"', 'bedding = "1 N/mm^3"'),
        "[supports] bedding is not read by this version; take it out.",
    ),
    (
        with_load('{ pressure = "-5 kPa" }'),
        f"{LOAD_1}: pressure = '-5 kPa': a load says up or down in words, such as "
        '"5 kPa down".',
    ),
    (
        with_load('{ pressure = "5 kPa" }'),
        f"{LOAD_1}: pressure = '5 kPa': a load says up or down in words, such as "
        '"5 kPa down".',
    ),
    (
        with_load('{ pressure = "-5 kPa down" }'),
        f"{LOAD_1}: pressure = '-5 kPa down': up or down says it all; take the sign "
        "'-' "
        "out.",
    ),
    (
        with_load('{ force = "20 kg down", at = ["0 m", "0 m"] }'),
        f"{LOAD_1}: force = '20 kg down': 'kg' is no unit of force; write it such as "
        '"1.5 kN".',
    ),
    (
        changed("200 mm x 100 mm", "200 mm"),
        f"{LOAD_1}: over = '200 mm': it must be a rectangle \"200 mm x 100 mm\" or, by "
        'its diameter, a "disc 150 mm".',
    ),
    (
        changed("200 mm x 100 mm", "200 x 100 mm"),
        f"{LOAD_1}: over = '200 x 100 mm': a length needs a unit, such as \"10 mm\".",
    ),
    (
        changed('["400 mm", "300 mm"]', '["400 mm", 300]'),
        f'{LOAD_1}: at, item 2 = 300: a length is text with its unit, such as "10 mm".',
    ),
    (
        with_load('{ force = "1 N up", at = ["0 m", "0 m"], angle = "30 deg" }'),
        f"{LOAD_1}: angle = '30 deg': only a rectangle can be turned; take it out.",
    ),
    (
        with_load('{ pressure = "1 Pa up", force = "1 N up" }'),
        f"{LOAD_1}: pressure and force are two loads; part them.",
    ),
    (
        with_load('{ presure = "1 Pa up" }'),
        f"{LOAD_1} states 'presure'; a load states one of pressure, force, line, "
        "edge_moment, moment, liquid, self_weight, such as "
        '{ pressure = "5 kPa down" }.',
    ),
    (
        with_load('{ liquid = "1 kg/m^3", level = "1 m", pushes = "out" }'),
        f"{LOAD_1}: pushes = 'out': it must be one of up, down.",
    ),
    (
        with_load('{ self_weight = "down" }').replace(
            '"steel S235"', '{ name = "own", E = "11 GPa", nu = 0.3 }'
        ),
        f"{LOAD_1}: self_weight = 'down': material 'own' states no density; add it.",
    ),
    (
        with_load(""),
        "[[case]] 1 'wheel': loads = an empty list: it must be a list with entries, "
        "such "
        'as [{ pressure = "5 kPa down" }].',
    ),
    (
        BASE + '[[case]]\nname = "wheel"\nloads = [{ self_weight = "down" }]\n',
        "[[case]] 2 'wheel': another case has this name; give each its own.",
    ),
    (
        changed("[[case]]", "[case]"),
        "section 'case' is a table; start it with the line [[case]].",
    ),
    (
        changed("factor = 1.5", "factor = 0"),
        "[limits] stress: the factor of the stress limit is 0; it must be a positive "
        "number.",
    ),
    (
        changed("von Mises", "Von Mises"),
        "[limits] stress: criterion = 'Von Mises': it must be one of von Mises, "
        "Tresca, largest principal. Did you mean 'von Mises'?",
    ),
    (
        changed("[limits]", '[limits]\ndeflection = { at_most = "span/200" }'),
        '[limits] deflection: span is missing; add span = "600 mm".',
    ),
    (
        changed("[limits]", '[limits]\ndeflection = { at_most = "L/200" }'),
        "[limits] deflection: at_most = 'L/200': it must be \"span/200\", say, or a "
        'length such as "3 mm".',
    ),
    (
        changed(
            "[limits]", '[limits]\ndeflection = { span = "1 m", at_most = "3 mm" }'
        ),
        "[limits] deflection: span = '1 m': at_most does not use it; take it out.",
    ),
    (
        changed("[limits]", "[limits]\nstock = []"),
        "[limits] stock = an empty list: it must be a list with entries, such as "
        '["6 mm", "8 mm", "10 mm"].',
    ),
    (
        changed("[limits]", "[limit]"),
        "unknown section 'limit'; the sections are [panel], [outline], [[hole]], "
        "[[zone]], [[seam]], [[mark]], [supports], [[case]], [[combination]], "
        "[limits], [[ask]]. Did you mean 'limits'?",
    ),
    (
        changed("[[case]]", "[[case]]\nreverses = true"),
        f"{CASE_1}: reverses = true: it must be one of yes, no.",
    ),
    (
        with_limit('deflection = { span = "side nroth", at_most = "span/200" }'),
        "[limits] deflection: span = 'side nroth': there is no such side; the sides "
        "are 'south', 'east', 'north', 'west'.",
    ),
    (
        with_limit('deflection = { span = "0 mm", at_most = "span/200" }'),
        "[limits] deflection: span = '0 mm': it must be a positive length.",
    ),
    (
        with_limit(
            'deflection = { span = "1 m", cantilever = "1 m", at_most = "span/200" }'
        ),
        "[limits] deflection: cantilever and span exclude each other; keep one.",
    ),
    (
        with_limit('deflection = { cantilever = "1 m", at_most = "4 mm" }'),
        "[limits] deflection: cantilever = '1 m': at_most does not use it; take it "
        "out.",
    ),
    (
        with_limit('deflection = { preset = "walkway", span = "1 m" }'),
        "[limits] deflection: preset = 'walkway': it must be one of walkway ISO "
        "14122-2, flooring BS 4592-0, floor EN 1993-1-1 France, total, floor EN "
        "1993-1-1 France, variable, floor IBC, live, floor IBC, dead and live, glass "
        "EN 16612, bolted flat cover.",
    ),
    (
        with_limit('deflection = { preset = "glass EN 16612" }'),
        '[limits] deflection: span is missing; add span = "600 mm".',
    ),
    (
        with_limit('deflection = { preset = "bolted flat cover", span = "1 m" }'),
        "[limits] deflection: span = '1 m': preset does not use it; take it out.",
    ),
    (
        with_limit(
            'deflection = { preset = "glass EN 16612", span = "1 m", at_most = "4 mm" }'
        ),
        "[limits] deflection: preset and at_most exclude each other; keep one.",
    ),
    (
        with_limit('deflection = [{ at_most = "3 mm" }, { at_most = "3" }]'),
        "[limits] deflection, item 2: at_most = '3': a length needs a unit, such as "
        '"10 mm".',
    ),
    (
        with_limit("deflection = []"),
        "[limits] deflection = an empty list: it must be a list with entries, such as "
        '{ span = "600 mm", at_most = "span/200" }.',
    ),
    (
        with_limit('step = { along = "south", at_most = "4 mm" }'),
        "[limits]: side 'south' is clamped: it does not move; judge the step along a "
        "free side.",
    ),
    (
        with_limit('step = { along = "nroth", at_most = "4 mm" }'),
        "[limits] step: along = 'nroth': there is no such side; the names are 'south', "
        "'east', 'north', 'west'. Did you mean 'north'?",
    ),
    (
        with_limit('step = { along = "north" }'),
        '[limits] step: at_most is missing; add at_most = "4 mm".',
    ),
    (
        with_limit('step = { along = "north", preset = "walkway" }'),
        "[limits] step: preset = 'walkway': it must be one of walkway ISO 14122-2.",
    ),
    (
        changed(STRESS, 'stress = { preset = "S235", factor = 1.0 }'),
        "[limits] stress: preset = 'S235': it must be one of steel S235 EN 10025-2, "
        "steel S275 EN 10025-2, steel S355 EN 10025-2, stainless 1.4301, aluminium "
        "5083, float glass.",
    ),
    (
        changed(STRESS, 'stress = { preset = "float glass" }'),
        "[limits] stress: factor is missing; add factor = 1.5.",
    ),
    (
        changed(STRESS, 'stress = { preset = "float glass", factor = "glas" }'),
        "[limits] stress: factor = 'glas': it must be one of steel, annealed glass.",
    ),
    (
        changed(
            STRESS, 'stress = { preset = "steel S235 EN 10025-2", factor = 1.5 }'
        ).replace('"10 mm"', '"70 mm"'),
        "[limits]: a thickness of 70 mm has no strength in steel S235 EN 10025-2, "
        "which end at 63 mm; state the strength.",
    ),
    (
        with_limit('stress_range = { of = "xx", at_most = "80 MPa" }'),
        "[limits] stress_range: of = 'xx': it must be one of stress xx, stress yy, "
        "stress xy, von Mises, Tresca, largest principal.",
    ),
    (
        with_limit("hold_down = { }"),
        '[limits] hold_down states no limit; give one such as corners = "200 N".',
    ),
    (
        with_limit('hold_down = { sides = "2 kN" }'),
        "[limits] hold_down: sides = '2 kN': 'kN' is no unit of line force; write it "
        'such as "2 kN/m".',
    ),
    (
        with_limit('hold_down = { corners = "2 kN", only = ["south"] }'),
        "[limits] hold_down: corners have no names; a limit on them holds for all.",
    ),
    (
        with_limit('bearing = { sides = "2 kN/m", only = ["north"] }'),
        "[limits]: limit on bearing: 'north' is none of the held sides; they are "
        "south.",
    ),
    (
        with_combination('name = "A"\nfactors = { wheel = 1.5 }'),
        "[[combination]] 1 'A': purpose is missing; add purpose = \"uplift\".",
    ),
    (
        with_combination('name = "A"\npurpose = "ULS"\nfactors = { wheel = 1.5 }'),
        "[[combination]] 1 'A': purpose = 'ULS': it must be one of strength, service, "
        "uplift.",
    ),
    (
        with_combination('name = "A"\npurpose = "strength"\nfactors = { weel = 1.5 }'),
        "[[combination]] 1 'A' factors: weel = 1.5: there is no such case; the cases "
        "are 'wheel'. Did you mean 'wheel'?",
    ),
    (
        with_combination('name = "A"\npurpose = "strength"\nfactors = { wheel = "2" }'),
        "[[combination]] 1 'A' factors: wheel = '2': it must be a number, without "
        "quotes and unit.",
    ),
    (
        with_combination('name = "A"\npurpose = "strength"\nfactors = [1.5]'),
        "[[combination]] 1 'A': factors = [1.5]: it must be a table such as { weight = "
        "0.9, wind = 1.5 }.",
    ),
    (
        with_combination('name = "A"\npurpose = "strength"\nfactors = { wheel = 0 }'),
        "[[combination]] 1 'A': combination 'A' has no factor but 0; give at least "
        "one.",
    ),
    (
        with_combination('name = "A"\npurpose = "service"\nfactors = { wheel = 1 }'),
        "[limits]: a limit on peak von Mises is judged in combinations for strength, "
        "of which there are none; add one.",
    ),
    (
        with_combination('preset = "EN 1990"\nvariable = ["wheel"]'),
        "[[combination]] 1: preset = 'EN 1990': it must be one of EN 1990 STR, EN 1990 "
        "EQU, EN 1990 characteristic. Did you mean 'EN 1990 STR'?",
    ),
    (
        with_combination('preset = "EN 1990 STR"\nvariable = ["crane"]'),
        "[[combination]] 1: variable = ['crane']: there is no case 'crane'; the cases "
        "are 'wheel'.",
    ),
    (
        with_combination('preset = "EN 1990 STR"\nvariable = ["wheel", "wheel"]'),
        "[[combination]] 1: variable = ['wheel', 'wheel']: it names 'wheel' twice; "
        "once will do.",
    ),
    (
        with_combination(
            'preset = "EN 1990 STR"\nvariable = ["wheel"]\npermanent = ["wheel"]'
        ),
        "[[combination]] 1: 'wheel' cannot be permanent and variable; keep one.",
    ),
    (
        with_combination('preset = "EN 1990 STR"'),
        "[[combination]] 1: preset EN 1990 STR has no cases; name permanent or "
        "variable.",
    ),
    (
        with_ask('name = "a"\nat = [900, 300]\nvalues = ["m_xx"]'),
        "[[ask]] 1 'a': (900, 300) mm is not on the plate; move it.",
    ),
    (
        with_ask('name = "a"\nat = "bolt"\nvalues = ["m_xx"]'),
        "[[ask]] 1 'a': at = 'bolt': there is no such mark; there is none.",
    ),
    (
        with_ask('name = "a"\nat = [400, 300]\nvalues = ["m_x"]'),
        "[[ask]] 1 'a': values = ['m_x']: there is no value 'm_x'; the values are "
        "deflection, slope_x, slope_y, m_xx, m_yy, m_xy, q_x, q_y, von Mises, Tresca, "
        "largest principal, smallest principal, shear stress. Did you mean 'm_xy'?",
    ),
    (
        with_ask('name = "a"\nat = [400, 300]'),
        '[[ask]] 1 \'a\': values is missing; add values = ["deflection", "m_xx"].',
    ),
    (
        with_ask('name = "a"\nfrom = [0, 0]\nvalues = ["m_xx"]'),
        "[[ask]] 1 'a': to is missing; add to = [800, 300].",
    ),
    (
        with_ask('name = "a"\nfrom = [0, 0]\nto = [0, 0]\nvalues = ["m_xx"]'),
        "[[ask]] 1 'a': a: give one place, or two different ends of a line.",
    ),
    (
        with_ask(
            'name = "a"\nfrom = [0, 0]\nto = [9, 9]\nstations = 1\nvalues = ["m_xx"]'
        ),
        "[[ask]] 1 'a': stations = 1: it must lie between 2 and 1000.",
    ),
    (
        with_ask('name = "a"\nat = [0, 0]\nto = [9, 9]\nvalues = ["m_xx"]'),
        "[[ask]] 1 'a': unknown field 'at'; the fields are name, from, to, stations, "
        "values.",
    ),
    (
        with_ask(
            'name = "a"\nat = [1, 1]\nvalues = ["m_xx"]\n'
            '[[ask]]\nname = "a"\nat = [2, 2]\nvalues = ["m_xx"]'
        ),
        "[[ask]] 2 'a': another point or line has this name; give each its own.",
    ),
    ("[panel]\n", "section [outline] is missing; add it."),
]


@pytest.mark.parametrize(("text", "message"), MISTAKES, ids=range(len(MISTAKES)))
def test_a_mistake_is_named(read, text, message):
    with pytest.raises(InputError) as caught:
        read(text)
    assert str(caught.value) == message


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (
            b"[panel]\nname = lid\n",
            "is not valid TOML: Invalid value (at line 2, column 8).",
        ),
        (
            b'[panel]\nheld in plane = "no"\n',
            "is not valid TOML: Expected '=' after a key in a key/value pair (at "
            "line 2, "
            'column 6); a name with spaces stands in quotes, "held in plane" = "no".',
        ),
        (
            b'[panel]\nname = "\xe9"\n',
            "is not UTF-8 text (byte 0xe9 in line 2); save it as UTF-8.",
        ),
        (b"a = " + b"[" * 9999, "nests its values too deeply."),
    ],
)
def test_a_file_that_is_no_toml(tmp_path, content, message):
    path = tmp_path / "panel.toml"
    path.write_bytes(content)
    with pytest.raises(InputError) as caught:
        read_panel(path)
    assert str(caught.value) == f"'{path}' {message}"


def test_a_file_that_cannot_be_read(tmp_path):
    with pytest.raises(InputError) as caught:
        read_panel(tmp_path)
    assert str(caught.value) == f"'{tmp_path}' is a folder; name a panel file (TOML)."
    path = tmp_path / "absent.toml"
    with pytest.raises(InputError) as caught:
        read_panel(path)
    assert (
        str(caught.value)
        == f"cannot read panel file '{path}': No such file or directory."
    )
    with pytest.raises(InputError, match=r"^cannot read panel file 'a.x00b': "):
        read_panel(Path("a\0b"))


# Whatever the file holds, a panel or a complaint on one line comes


TOKEN = re.compile(r'"[^"\n]*"|[A-Za-z_-]+|[0-9.]+|[^\S\n]+|\S|\n')
TEXTS = [RICH, *(path.read_text(encoding="utf-8") for path in SAMPLES)]
TOKENS = [TOKEN.findall(text) for text in TEXTS]
VALUES = [
    *("nan", "-inf", "true", "0", "-1", "1e308", "1e-308", "1e400", "9" * 5000),
    *("[]", "{}", "[[]]", "{ a = 1 }", "1979-05-27", "[" * 2000, "0x" + "f" * 5000),
    *('""', '" "', '"10"', '"0 mm"', '"-5 mm"', '"1e999 mm"', '"5 degC"', '"\\n"'),
    *(
        '"5 kPa up"',
        '"disc 5 mm"',
        '"1 mm x 2 mm"',
        '"span/0"',
        '"guided"',
        '"\\u2028"',
    ),
    *("[zone]\n", "[[ask]]\n", "\0", "\x7f", '"' + "x" * 300 + '"', "[1, 2]"),
    "[[0, 0], [1, 1], [1, 0], [0, 1]]",
    "[[0, 0], [0, 0], [0, 0]]",
    "[[0, 0], [1e-300, 0], [0, 1e-300]]",
    "[[0, 0], [1e15, 0], [0, 1]]",
    "{ centre = [0, 0], radius = 1e-9 }",
    "{ centre = [300, 300], size = [1e-3, 1e3] }",
    "{ centre = [300, 300], length = 60, width = 59.9999999 }",
    "{ from = [0, 0], through = [1, 1] }",
    *('"+x"', '"top"', '"100 N m/m"', '"40 %"', '"100 %"', '"arc"', '"polygon"'),
    *('"guided"', '"weir"', '"hinge"', '"rib"', '"pin"', '"doubler"', '"a.dxf"'),
    '"../../x.csv"',
]


@st.composite
def spoiled_files(draw: st.DrawFn) -> str:
    """Draw a sample file with tokens dropped, doubled, replaced or typed over."""
    tokens = list(draw(st.sampled_from(TOKENS)))
    for _ in range(draw(st.integers(1, 4))):
        i = draw(st.integers(0, len(tokens) - 1))
        how = draw(
            st.sampled_from(["drop", "double", "value", "value", "token", "type"])
        )
        if how == "drop":
            tokens[i] = ""
        elif how == "double":
            tokens[i] *= 2
        elif how == "value":
            tokens[i] = draw(st.sampled_from(VALUES))
        elif how == "token":
            tokens[i] = draw(st.sampled_from(tokens))
        else:
            cut = draw(st.integers(0, len(tokens[i])))
            typed = draw(st.text(max_size=3))
            tokens[i] = tokens[i][:cut] + typed + tokens[i][cut:]
    return "".join(tokens)


def panel_or_complaint(path: Path) -> Panel | InputError:
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", KplateWarning)
        try:
            return read_panel(path)
        except InputError as error:
            return error


@settings(
    max_examples=400,
    derandomize=True,
    deadline=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
@given(text=spoiled_files())
def test_a_spoiled_file_gives_a_panel_or_one_line(tmp_path, text):
    path = tmp_path / "panel.toml"
    path.write_bytes(text.encode("utf-8", errors="surrogatepass"))
    found = panel_or_complaint(path)
    if isinstance(found, InputError):
        message = str(found).replace(str(path), "panel.toml")
        assert len(message.splitlines()) == 1
        assert len(message) < 300
    else:
        assert found.cases
