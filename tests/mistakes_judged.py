"""Broken panel files: roaming, combinations, limits, stock, asks; each exact line."""

from panel_texts import (
    LOAD,
    changed,
    with_ask,
    with_combination,
    with_limit,
    with_roaming,
)

CASE_1 = "[[case]] 1 'wheel'"
ROAMING = f"{CASE_1} roaming"
FORCE, OVER, STEP = 'force = "1 kN down"', 'over = "0.1 m x 0.2 m"', 'step = "0.1 m"'
STRESS = 'stress = { criterion = "von Mises", strength = "235 MPa", factor = 1.5 }'
LIMITS = (
    "deflection, step, stress, stress_range, hold_down, bearing, stock, "
    "under_tolerance, corrosion"
)
JUDGED = [
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
    (
        with_roaming(OVER, STEP),
        f'{ROAMING}: force is missing; add force = "1.5 kN down".',
    ),
    (
        with_roaming('force = "1 kN"', OVER, STEP),
        f"{ROAMING}: force = '1 kN': a load says up or down in words, such as "
        '"1.5 kN down".',
    ),
    (
        with_roaming(FORCE, STEP),
        f'{ROAMING}: over is missing; add over = "200 mm x 200 mm".',
    ),
    (
        with_roaming(FORCE, OVER),
        f'{ROAMING}: step is missing; add step = "100 mm".',
    ),
    (
        with_roaming(FORCE, OVER, 'step = "0 mm"'),
        f"{ROAMING}: step = '0 mm': it must be a positive length.",
    ),
    (
        with_roaming(FORCE, OVER, "step = 100"),
        f'{ROAMING}: step = 100: a length is text with its unit, such as "10 mm".',
    ),
    (
        with_roaming(FORCE, 'over = "disc 80 mm"', STEP, 'angle = "30 deg"'),
        f"{ROAMING}: angle = '30 deg': only a rectangle can be turned; take it out.",
    ),
    (
        with_roaming(FORCE, OVER, STEP, 'on = "lane"'),
        f"{ROAMING}: on = 'lane': there is no such zone; the names are 'panel'. Did "
        "you mean 'panel'?",
    ),
    (
        with_roaming(FORCE, OVER, STEP, 'pace = "1 m"'),
        f"{ROAMING}: unknown field 'pace'; the fields are force, over, angle, on, "
        "step.",
    ),
    (
        changed(f"loads = [{LOAD}]", 'roaming = "wheel"'),
        f"{ROAMING} is 'wheel'; it must be a table such as "
        '{ force = "1.5 kN down" }.',
    ),
    (
        with_roaming(FORCE, OVER, STEP).replace(
            "[limits]", 'reverses = "yes"\n\n[limits]'
        ),
        f"{CASE_1}: reverses = 'yes': a patch that roams acts one way; state a second "
        "case.",
    ),
    (
        with_roaming(FORCE, OVER, STEP)
        + '[[combination]]\npreset = "EN 1990 STR"\nvariable = ["wheel"]\n',
        "case 'wheel' roams, and there are combinations: where it governs would depend "
        "on them. State what acts at the same time as the loads of that case, and take "
        "[[combination]] out.",
    ),
    (
        with_limit('stock = ["6 mm", "8"]'),
        "[limits] stock, item 2 = '8': a length needs a unit, such as \"10 mm\".",
    ),
    (
        with_limit('stock = "6 mm"'),
        "[limits] stock = '6 mm': it must be a list with entries, such as "
        '["6 mm", "8 mm", "10 mm"].',
    ),
    (
        with_limit('stock = ["-6 mm"]'),
        "[limits] stock, item 1 = '-6 mm': it must be a positive length.",
    ),
    (
        with_limit('under_tolerance = "-0.3 mm"'),
        "[limits] under_tolerance = '-0.3 mm': it must be a positive length.",
    ),
    (
        with_limit("corrosion = 1"),
        '[limits] corrosion = 1: a length is text with its unit, such as "10 mm".',
    ),
    (
        with_limit('corosion = "1 mm"'),
        f"[limits]: unknown field 'corosion'; the fields are {LIMITS}. Did you mean "
        "'corrosion'?",
    ),
    (
        with_limit('frequency = "10 Hz"'),
        "[limits] frequency is not read by this version; take it out.",
    ),
    (
        with_limit('bearing = "2 kN/m"'),
        "[limits] bearing = '2 kN/m': 'kN/m' is no unit of force; write it such as "
        '"1.5 kN".',
    ),
    (
        with_limit(
            'step = [{ along = "north", at_most = "4 mm" }, { at_most = "1 m" }]'
        ),
        '[limits] step, item 2: along is missing; add along = "north".',
    ),
    (
        changed(STRESS, f'stress = [{STRESS[9:]}, {{ criterion = "Tresca" }}]'),
        "[limits] stress, item 2: factor is missing; add factor = 1.5.",
    ),
    (
        with_combination(
            'name = "A"\npurpose = "strength"\nfactors = { wheel = 1 }\nspan = 3'
        ),
        "[[combination]] 1 'A': unknown field 'span'; the fields are name, purpose, "
        "factors.",
    ),
    (
        with_combination('preset = "EN 1990 STR"\nvariable = ["wheel"]\nname = "A"'),
        "[[combination]] 1 'A': unknown field 'name'; the fields are preset, "
        "permanent, variable.",
    ),
    (
        with_combination(
            'name = "A"\npurpose = "strength"\nfactors = { wheel = 1 }\n'
            '[[combination]]\nname = "A"\npurpose = "strength"\n'
            "factors = { wheel = 2 }"
        ),
        "[[combination]]: 2 combinations are called 'A'; each needs a name of its own.",
    ),
    (
        with_ask('at = [400, 300]\nvalues = ["m_xx"]'),
        '[[ask]] 1: name is missing; add name = "camera".',
    ),
    (
        with_ask('name = "a"\nat = [400, 300]\nvalues = []'),
        "[[ask]] 1 'a': values = an empty list: it must be a list with entries, such "
        'as ["deflection", "m_xx"].',
    ),
    (
        with_ask(
            'name = "a"\nfrom = [0, 0]\nto = [9, 9]\nstations = "5"\nvalues = ["m_xx"]'
        ),
        "[[ask]] 1 'a': stations = '5': it must be a whole number, without quotes.",
    ),
]
