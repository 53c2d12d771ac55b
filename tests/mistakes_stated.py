"""Broken panel files: what a panel is, how it is held and loaded; each exact line."""

from panel_texts import BASE, changed, with_load, with_section

CASE_1 = "[[case]] 1 'wheel'"
LOAD_1 = f"{CASE_1}, load 1"
NAMES = "the names are 'south', 'east', 'north', 'west'."
HEAD_FIELDS = (
    "name, revision, author, thickness, material, tolerance, held in plane, triangles, "
    "element, design moments"
)
STATED = [
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
        changed("[limits]", "[limit]"),
        "unknown section 'limit'; the sections are [panel], [outline], [[hole]], "
        "[[zone]], [[seam]], [[mark]], [supports], [[case]], [[combination]], "
        "[limits], [[ask]]. Did you mean 'limits'?",
    ),
    (
        changed("[[case]]", "[[case]]\nreverses = true"),
        f"{CASE_1}: reverses = true: it must be one of yes, no.",
    ),
    ("[panel]\n", "section [outline] is missing; add it."),
    (
        with_section('[[zone]]\nname = "pad"\nthickness = "12 mm"'),
        "[[zone]] 1 'pad': its shape is missing; add points = [[100, 100], [200, 100], "
        "[200, 200]], or one of circle, slot, rectangle, ellipse.",
    ),
    (
        with_section("[[zone]]\ncircle = { centre = [400, 300], radius = 50 }"),
        '[[zone]] 1: name is missing; add name = "pad".',
    ),
    (
        with_section(
            '[[zone]]\nname = "pad"\ncircle = { centre = [400, 300], radius = 50 }\n'
            'thickness = "12"'
        ),
        "[[zone]] 1 'pad': thickness = '12': a length needs a unit, such as \"10 mm\".",
    ),
    (
        with_section('[[seam]]\nname = "rib"\npoints = [[400, 0], [900, 600]]'),
        "[[seam]]: seam 'rib' leaves the plate near (0.850001, 0.540001) m; end it on "
        "the boundary.",
    ),
    (
        with_section('[[mark]]\nname = "bolt"\nat = [900, 300]'),
        "[[mark]]: mark 'bolt' at (0.9, 0.3) m is not on the plate; it lies outside "
        "the outline or in a hole.",
    ),
    (
        with_section('[[mark]]\nname = "bolt"'),
        "[[mark]] 1 'bolt': at is missing; add at = [400, 300].",
    ),
    (
        with_section('[[mark]]\nname = "south"\nat = [400, 300]'),
        "[[mark]]: mark 'south' has the name of something else; sides, zones, seams "
        "and marks need names of their own.",
    ),
    (
        with_section('[[mark]]\nname = "bolt"\nat = [400, 300]').replace(
            'south = "clamped"', 'bolt = "clamped"'
        ),
        "[supports]: mark 'bolt' is clamped; a point of a thin plate can only be "
        "simply supported. Hold a slope along a seam or a side.",
    ),
    (
        changed(
            "sides =",
            'fillets = [{ corner = ["south", "north"], radius = 20 }]\nsides =',
        ),
        "[outline] fillets, item 1: sides 'south' and 'north' do not meet at a corner; "
        "the corners are west/south, south/east, east/north, north/west.",
    ),
    (
        changed("sides =", "expect = { holes = 1 }\nsides ="),
        "[outline] expect: holes = 1: the panel has 0.",
    ),
    (
        changed("sides =", 'layer = "0"\nsides ='),
        "[outline] layer = '0': it goes with a file; take it out.",
    ),
    (
        changed("points = [[0, 0], [800, 0], [800, 600], [0, 600]]", 'file = "a.pdf"'),
        "[outline] file = 'a.pdf': it must end in one of .dxf, .step, .stp, .csv, "
        ".msh.",
    ),
    (
        with_load('{ line = "1 kN/m down", along = "rib" }'),
        f"{LOAD_1}: along = 'rib': there is no such side or seam; {NAMES}",
    ),
    (
        with_load('{ edge_moment = "10 N m/m", along = "north", stretches = "up" }'),
        f"{LOAD_1}: stretches = 'up': it must be one of bottom, top.",
    ),
    (
        with_load('{ moment = "10 N m", lifts = "z", at = ["1 m", "1 m"] }'),
        f"{LOAD_1}: lifts = 'z': it must be one of +x, -x, +y, -y.",
    ),
    (
        with_load('{ pressure = "1 kPa down", on = "pad" }'),
        f"{LOAD_1}: on = 'pad': there is no such zone; there is none.",
    ),
]
