"""A sound scenario, and what can be wrong with it outside its layers.

what is wrong: (what SOUND says, what it says instead, the sentence)
"""

SOUND = """\
format = 1
title = "sound"

[conditions]
temperature_K = 77

[leads]
left = { material = "GaAs" }
right = { material = "GaAs" }

[stack]
periods = 8
entry = [ { delta_eV_nm = 0.1 } ]
cell = [
    { material = "AlGaAs", x = 0.3, monolayers = 9 },
    { band_edge_eV = 0.1, mass = 0.07, thickness_nm = 6.5 },
]
exit = [ { repeat = 2, layers = [ { material = "AlAs", thickness_nm = 1 }, { material = "mine", thickness_nm = 2 } ] } ]

[target]
windows = [ { kind = "pass", from_meV = 45, to_meV = 60, transmission = 0.3 } ]

[materials.mine]
band_edge_eV = 0.2
mass = 0.1
"""

WRONG_FILES = {
    # the file as a whole
    "format missing": ("format = 1\n", "", "format: is missing; begin the file with format = 1"),
    "format 2": ("format = 1", "format = 2", "format: is 2, but this version reads format = 1 only"),
    "format as text": ("format = 1", 'format = "1"', 'format: is "1", but this version reads format = 1 only'),
    "format true": ("format = 1", "format = true", "format: is true, but this version reads format = 1 only"),
    "format 1.0": ("format = 1", "format = 1.0", "format: is 1.0, but this version reads format = 1 only"),
    "unknown section": (
        "[target]", "[cooling]\nrate = 1\n[target]",
        "cooling: is not a key of a scenario; known here: format, title, note, conditions, leads, stack, "
        "target, growth, measured, materials",
    ),
    "a peak without a place": (
        "[target]", "[measured]\npeaks = [ { width_meV = 1 } ]\n[target]",
        "measured.peaks[0]: has no place; give energy_meV, or bias_V",
    ),
    "a peak in two places": (
        "[target]", "[measured]\npeaks = [ { energy_meV = 1, bias_V = 1 } ]\n[target]",
        "measured.peaks[0].bias_V: stands beside energy_meV; keep one of them",
    ),
    "no lever arm": (
        "[target]", "[measured]\nlever_arm = 0\n[target]",
        "measured.lever_arm: must be above 0 and at most 1, but is 0.0",
    ),
    "growth out of limits": (
        "[target]", "[growth]\nmass_percent = 51\n[target]",
        "growth.mass_percent: must be from 0 to 50 %, but is 51.0",
    ),
    "growth misspelt": (
        "[target]", "[growth]\nmonolayers = 1\n[target]",
        "growth.monolayers: is not a key of [growth]; did you mean monolayer_error?",
    ),
    "growth of nothing": (
        "[target]", "[growth]\noffset_percent = 0\nmass_percent = 0\nmonolayer_error = 0\n[target]",
        "growth: leaves no range, all its figures are 0; give offset_percent, mass_percent or monolayer_error, "
        "or take it out",
    ),
    "misspelt section": ("[target]", "[targets]", "targets: is not a key of a scenario; did you mean target?"),
    "misspelt key": (
        "temperature_K", "temperature",
        "conditions.temperature: is not a key of [conditions]; did you mean temperature_K?",
    ),
    "broken TOML": (
        "periods = 8", "periods = ",
        "scenario: is not valid TOML: Invalid value (at line 12, column 11); mend it there",
    ),
    "unfinished text": (
        '"sound"', '"sound',
        "scenario: is not valid TOML: Illegal character '\\n' (at line 2, column 15); mend it there",
    ),
    "key twice": (
        "periods = 8", "periods = 8\nperiods = 9",
        "scenario: is not valid TOML: Cannot overwrite a value (at line 13, column 12); mend it there",
    ),
    "endless integer": (
        "periods = 8", "periods = " + "9" * 5000,
        "scenario: holds a whole number of too many digits; write a smaller one",
    ),
    "deep nesting": (
        "periods = 8", "periods = " + "[" * 5000,
        "scenario: is nested too deeply; a list of layers holds plain layers",
    ),
    "long dotted key": (
        "periods = 8", ".".join("a" * 5000) + " = 1",
        "scenario: holds a dotted key of more than 32 parts; write it out",
    ),
    "nested lists": (
        "entry = [ { delta_eV_nm = 0.1 } ]", "entry = [[]]",
        "stack.entry[0]: must be a table of keys and values, but is a list",
    ),
    "line break in a key": (
        "periods = 8", 'periods = 8\n"a\\nb" = 1',
        "stack.a\\nb: is not a key of [stack]; known here: periods, bias_V, drop_V, entry, cell, exit, ends",
    ),
    # text
    "title a number": ('"sound"', "3", "title: must be text in quotes, but is 3"),
    "title empty": ('"sound"', '""', "title: must have 1 to 200 characters, but has 0"),
    "title too long": ('"sound"', '"' + "a" * 201 + '"', "title: must have 1 to 200 characters, but has 201"),
    "title with an escape character": (
        '"sound"', r'"so\u001Bund"',
        "title: holds the control character U+001B; take it out",
    ),
    "title with a line break": ('"sound"', r'"so\nund"', "title: holds the control character U+000A; take it out"),
    "note too long": (
        'title = "sound"', 'note = "' + "a" * 10_001 + '"',
        "note: must have 0 to 10,000 characters, but has 10,001",
    ),
    "note with a null": (
        'title = "sound"', r'note = "\u0000"',
        "note: holds the control character U+0000; take it out",
    ),
    "title a date": ('"sound"', "1979-05-27", "title: must be text in quotes, but is 1979-05-27"),
    # conditions
    "absolute zero": (
        "temperature_K = 77", "temperature_K = 0",
        "conditions.temperature_K: must be above 0 and at most 2,000 K, but is 0.0",
    ),
    "negative zero": (
        "temperature_K = 77", "temperature_K = -0.0",
        "conditions.temperature_K: must be above 0 and at most 2,000 K, but is -0.0",
    ),
    "too hot": (
        "temperature_K = 77", "temperature_K = 2000.5",
        "conditions.temperature_K: must be above 0 and at most 2,000 K, but is 2000.5",
    ),
    "not a number": (
        "temperature_K = 77", "temperature_K = nan",
        "conditions.temperature_K: must be above 0 and at most 2,000 K, but is nan",
    ),
    "infinite": (
        "temperature_K = 77", "temperature_K = inf",
        "conditions.temperature_K: must be above 0 and at most 2,000 K, but is inf",
    ),
    "text for a number": (
        "temperature_K = 77", 'temperature_K = "77"',
        'conditions.temperature_K: must be a number, but is "77"; write it without quotes',
    ),
    "true for a number": (
        "temperature_K = 77", "temperature_K = true",
        "conditions.temperature_K: must be a number, but is true",
    ),
    "huge for a number": (
        "temperature_K = 77", "temperature_K = " + "9" * 400,
        "conditions.temperature_K: is a whole number of more than 40 digits, too large a number; write a smaller one",
    ),
    "list for a number": (
        "temperature_K = 77", "temperature_K = [77]",
        "conditions.temperature_K: must be a number, but is a list",
    ),
    "negative dephasing": (
        "temperature_K = 77", "dephasing_meV = -1",
        "conditions.dephasing_meV: must be from 0 to 1,000,000 meV, but is -1.0",
    ),
    "negative resolution": (
        "temperature_K = 77", "resolution_meV = -1",
        "conditions.resolution_meV: must be from 0 to 1,000,000 meV, but is -1.0",
    ),
    "number for a switch": (
        "temperature_K = 77", "nonparabolic = 1",
        "conditions.nonparabolic: must be true or false, but is 1",
    ),
    "substrate unknown": (
        "temperature_K = 77", 'substrate = "mica"',
        'conditions.substrate: "mica" is not a substrate of the library; known here: GaAs, AlAs, InAs, InP, GaSb, AlSb',
    ),
    "substrate an alloy": (
        "temperature_K = 77", 'substrate = "AlGaAs"',
        'conditions.substrate: "AlGaAs" is not a substrate of the library; did you mean GaAs?',
    ),
    "gap closed": (
        'temperature_K = 77\n\n[leads]\nleft = { material = "GaAs" }',
        'temperature_K = 1900\n\n[leads]\nleft = { material = "InAs" }',
        "conditions.temperature_K: is 1900 K, where the gap of InAs has closed; lower it",
    ),
    # leads
    "a lead missing": ('right = { material = "GaAs" }\n', "", "leads.right: is missing; [leads] needs it"),
    "leads missing": (
        '[leads]\nleft = { material = "GaAs" }\nright = { material = "GaAs" }\n', "",
        "leads: is missing; a scenario needs it",
    ),
    "an empty lead": (
        'right = { material = "GaAs" }', "right = { }",
        "leads.right: says nothing of its material; give material, or band_edge_eV and mass",
    ),
    "a lead with two natures": (
        'right = { material = "GaAs" }', 'right = { material = "GaAs", band_edge_eV = 0 }',
        "leads.right.band_edge_eV: stands beside material; keep one of them",
    ),
    "a lead without mass": (
        'right = { material = "GaAs" }', "right = { band_edge_eV = 0 }",
        "leads.right.mass: is missing; a lead given by its band edge needs a mass",
    ),
    "a material lead with a mass": (
        'right = { material = "GaAs" }', 'right = { material = "GaAs", mass = 0.07 }',
        "leads.right.mass: does not belong to a lead given by its material, which takes material, x, "
        "donors_cm3, fermi_meV; take it out",
    ),
    "a lead material unknown": (
        'right = { material = "GaAs" }', 'right = { material = "GaAd" }',
        'leads.right.material: "GaAd" is neither in the library nor in [materials]; did you mean GaAs?',
    ),
    "a lead alloy without x": (
        'right = { material = "GaAs" }', 'right = { material = "InGaAs" }',
        "leads.right.x: is missing; InGaAs is an alloy, give its share from 0 to 1",
    ),
    "two Fermi levels": (
        'right = { material = "GaAs" }', 'right = { material = "GaAs", donors_cm3 = 1e18, fermi_meV = 5 }',
        "leads.right.fermi_meV: stands beside donors_cm3; keep one of them",
    ),
    "no donors": (
        'right = { material = "GaAs" }', 'right = { material = "GaAs", donors_cm3 = 0 }',
        "leads.right.donors_cm3: must be above 0 and at most 1e+22 per cm3, but is 0.0",
    ),
    "a library layer beside an explicit lead": (
        'left = { material = "GaAs" }', "left = { band_edge_eV = 0, mass = 0.067 }",
        "stack.cell[0].material: AlGaAs has no known offset from a left lead that is not of the library; "
        "give [materials.AlGaAs] a band_edge_eV and mass, or the left lead a library material",
    ),
    # the target
    "window kind": ('"pass"', '"stop"', 'target.windows[0].kind: must be one of pass, block, but is "stop"'),
    "window kind missing": ('kind = "pass", ', "", "target.windows[0].kind: is missing; a window needs it"),
    "window upside down": (
        "to_meV = 60", "to_meV = 45",
        "target.windows[0].to_meV: must be above from_meV (45.0), but is 45.0",
    ),
    "window measure": (
        "transmission = 0.3", 'transmission = 0.3, measure = "maximum"',
        'target.windows[0].measure: is "maximum", but a pass window is measured by its minimum or its mean',
    ),
    "window measure of a block": (
        '"pass", from_meV = 45, to_meV = 60, transmission = 0.3',
        '"block", from_meV = 45, to_meV = 60, transmission = 0.3, measure = "minimum"',
        'target.windows[0].measure: is "minimum", but a block window is measured by its maximum or its mean',
    ),
    "window measure unknown": (
        "transmission = 0.3", 'transmission = 0.3, measure = "median"',
        'target.windows[0].measure: must be one of minimum, maximum, mean, but is "median"',
    ),
    "transmission zero": (
        "transmission = 0.3", "transmission = 0",
        "target.windows[0].transmission: must be above 0 and at most 1, but is 0.0",
    ),
    "transmission above 1": (
        "transmission = 0.3", "transmission = 1.5",
        "target.windows[0].transmission: must be above 0 and at most 1, but is 1.5",
    ),
    "most_periods zero": (
        "[target]", "[target]\nmost_periods = 0",
        "target.most_periods: must be a whole number from 1 to 2,000, but is 0",
    ),
    "most_periods too many": (
        "[target]", "[target]\nmost_periods = 2001",
        "target.most_periods: must be a whole number from 1 to 2,000, but is 2001",
    ),
    "window too high": (
        "to_meV = 60", "to_meV = 2e6",
        "target.windows[0].to_meV: must be from -1,000,000 to 1,000,000 meV, but is 2000000.0",
    ),
    # materials of the scenario
    "material without an edge": (
        "band_edge_eV = 0.2\n", "",
        "materials.mine.band_edge_eV: is missing; a material needs it",
    ),
    "material without a mass": (
        "band_edge_eV = 0.2\nmass = 0.1", "band_edge_eV = 0.2",
        "materials.mine.mass: is missing; a material needs it",
    ),
    "material of no mass": (
        "band_edge_eV = 0.2\nmass = 0.1", "band_edge_eV = 0.2\nmass = 0.0",
        "materials.mine.mass: must be from 0.0001 to 1,000 m0, but is 0.0",
    ),
    "material gap": (
        "band_edge_eV = 0.2\n", "band_edge_eV = 0.2\ngap_eV = 0\n",
        "materials.mine.gap_eV: must be above 0 and at most 1,000 eV, but is 0.0",
    ),
    "material key": (
        "band_edge_eV = 0.2\n", "band_edge_eV = 0.2\ngap = 1\n",
        "materials.mine.gap: is not a key of a material; did you mean gap_eV?",
    ),
    "material name in the table": (
        "band_edge_eV = 0.2\n", 'band_edge_eV = 0.2\nname = "x"\n',
        "materials.mine.name: is not a key here; the name stands in the heading",
    ),
    "material not a table": (
        "[materials.mine]\nband_edge_eV = 0.2\nmass = 0.1", "[materials]\nmine = 3",
        "materials.mine: must be a table, but is 3",
    ),
    "material name too long": (
        "[materials.mine]", "[materials." + "a" * 61 + "]",
        "materials." + "a" * 61 + ": must have 1 to 60 characters, but has 61",
    ),
    "material name with a line break": (
        "[materials.mine]", r'[materials."a\nb"]',
        "materials.a\\nb: holds the control character U+000A; take it out",
    ),
}
