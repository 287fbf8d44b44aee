"""What can be wrong with the stack and the layers of a scenario that is sound otherwise.

what is wrong: (what SOUND says, what it says instead, the sentence)
"""

CELL = """\
cell = [
    { material = "AlGaAs", x = 0.3, monolayers = 9 },
    { band_edge_eV = 0.1, mass = 0.07, thickness_nm = 6.5 },
]"""

WRONG_LAYERS = {
    # the stack
    "periods missing": ("periods = 8\n", "", "stack.periods: is missing; [stack] needs it"),
    "no periods": ("periods = 8", "periods = 0", "stack.periods: must be a whole number from 1 to 1,000,000, but is 0"),
    "too many periods": (
        "periods = 8", "periods = 1000001",
        "stack.periods: must be a whole number from 1 to 1,000,000, but is 1000001",
    ),
    "a fraction of periods": (
        "periods = 8", "periods = 8.5",
        "stack.periods: must be a whole number, but is 8.5; write it without a decimal point",
    ),
    "periods true": ("periods = 8", "periods = true", "stack.periods: must be a whole number, but is true"),
    "40-digit periods": (
        "periods = 8", "periods = 1" + "0" * 50,
        "stack.periods: must be a whole number from 1 to 1,000,000, but is a whole number of more than 40 digits",
    ),
    "bias": (
        "periods = 8", "periods = 8\nbias_V = 0.1",
        "stack.bias_V: is 0.1: the stack would be tilted and no longer periodic, which this version does not "
        "compute; set it to 0",
    ),
    "drop": (
        "periods = 8", "periods = 8\ndrop_V = -0.1",
        "stack.drop_V: is -0.1: the stack would be tilted and no longer periodic, which this version does "
        "not compute; set it to 0",
    ),
    "built-in drop": (
        'left = { material = "GaAs" }\nright = { material = "GaAs" }',
        'left = { material = "GaAs", fermi_meV = 4 }\nright = { material = "GaAs", fermi_meV = 5 }',
        "stack.bias_V: is 0, but the leads' Fermi levels differ and leave a built-in drop: the stack would "
        "be tilted and no longer periodic, which this version does not compute; give both leads the same "
        "doping, or set stack.drop_V = 0",
    ),
    "cell missing": ("cell = [", "cells = [", "stack.cells: is not a key of [stack]; did you mean cell?"),
    "cell empty": (
        CELL, "cell = []",
        "stack.cell: is empty; give it at least one layer",
    ),
    "cell of deltas": (
        CELL, "cell = [ { delta_eV_nm = 1 } ]",
        "stack.cell: holds deltas only and has no length; give it at least one layer with a thickness",
    ),
    "cell a table": (
        "entry = [ { delta_eV_nm = 0.1 } ]", "entry = { delta_eV_nm = 0.1 }",
        "stack.entry: must be a list in [ ], but is a table",
    ),
    "built-in drop of donors": (
        'left = { material = "GaAs" }\nright = { material = "GaAs" }',
        'left = { material = "GaAs", donors_cm3 = 1e18 }\nright = { material = "GaAs", donors_cm3 = 2e18 }',
        "stack.bias_V: is 0, but the leads' Fermi levels differ and leave a built-in drop: the stack would "
        "be tilted and no longer periodic, which this version does not compute; give both leads the same "
        "doping, or set stack.drop_V = 0",
    ),
    # layers
    "layer a number": ("{ delta_eV_nm = 0.1 }", "5", "stack.entry[0]: must be a table of keys and values, but is 5"),
    "layer empty": (
        "{ delta_eV_nm = 0.1 }", "{ }",
        "stack.entry[0]: does not say what it is; give material, or band_edge_eV and mass, or delta_eV_nm, or "
        "profile",
    ),
    "layer with a mass only": (
        "{ delta_eV_nm = 0.1 }", "{ mass = 0.1 }",
        "stack.entry[0]: does not say what it is; give material, or band_edge_eV and mass, or delta_eV_nm, or "
        "profile",
    ),
    "layer with two natures": (
        "{ delta_eV_nm = 0.1 }", "{ delta_eV_nm = 0.1, band_edge_eV = 0.1 }",
        "stack.entry[0].delta_eV_nm: stands beside band_edge_eV; keep one of them",
    ),
    "delta with a thickness": (
        "{ delta_eV_nm = 0.1 }", "{ delta_eV_nm = 0.1, thickness_nm = 1 }",
        "stack.entry[0].thickness_nm: does not belong to a delta, which takes delta_eV_nm; take it out",
    ),
    "delta infinite": (
        "{ delta_eV_nm = 0.1 }", "{ delta_eV_nm = -inf }",
        "stack.entry[0].delta_eV_nm: must be from -10,000,000 to 10,000,000 eV nm, but is -inf",
    ),
    "thickness zero": (
        "thickness_nm = 6.5", "thickness_nm = 0",
        "stack.cell[1].thickness_nm: must be above 0 and at most 10,000 nm, but is 0.0",
    ),
    "thickness negative": (
        "thickness_nm = 6.5", "thickness_nm = -3",
        "stack.cell[1].thickness_nm: must be above 0 and at most 10,000 nm, but is -3.0",
    ),
    "thickness too large": (
        "thickness_nm = 6.5", "thickness_nm = 1e4000",
        "stack.cell[1].thickness_nm: must be above 0 and at most 10,000 nm, but is inf",
    ),
    "thickness missing": (", thickness_nm = 6.5", "", "stack.cell[1].thickness_nm: is missing; give it"),
    "thickness twice": (
        "monolayers = 9", "monolayers = 9, thickness_nm = 1",
        "stack.cell[0].monolayers: stands beside thickness_nm; keep one of them",
    ),
    "thickness misspelt": (
        "thickness_nm = 6.5", "thicknes_nm = 6.5",
        "stack.cell[1].thicknes_nm: is not a key of a layer; did you mean thickness_nm?",
    ),
    "monolayers of an explicit layer": (
        "thickness_nm = 6.5", "monolayers = 6.5",
        "stack.cell[1].monolayers: does not belong to a layer given by its band edge, which takes "
        "band_edge_eV, mass, thickness_nm, nonparabolicity_per_eV, grading_nm; take it out",
    ),
    "monolayers negative": (
        "monolayers = 9", "monolayers = -9",
        "stack.cell[0].monolayers: must be above 0 and at most 20,000 monolayers, but is -9.0",
    ),
    "monolayers too many": (
        "monolayers = 9", "monolayers = 20001",
        "stack.cell[0].monolayers: must be above 0 and at most 20,000 monolayers, but is 20001.0",
    ),
    "monolayers of a material without": (
        '{ material = "mine", thickness_nm = 2 }', '{ material = "mine", monolayers = 2 }',
        "stack.exit[0].layers[1].monolayers: needs the thickness of one; give [materials.mine] a "
        "monolayer_nm, or the layer a thickness_nm",
    ),
    "x missing": ("x = 0.3, ", "", "stack.cell[0].x: is missing; AlGaAs is an alloy, give its share from 0 to 1"),
    "x of a binary": (
        'material = "AlAs",', 'material = "AlAs", x = 0.5,',
        "stack.exit[0].layers[0].x: does not belong to AlAs, which is no alloy; take it out",
    ),
    "x above 1": ("x = 0.3", "x = 1.0001", "stack.cell[0].x: must be from 0 to 1, but is 1.0001"),
    "x below 0": ("x = 0.3", "x = -0.1", "stack.cell[0].x: must be from 0 to 1, but is -0.1"),
    "x as text": ("x = 0.3", 'x = "0.3"', 'stack.cell[0].x: must be a number, but is "0.3"; write it without quotes'),
    "x of a material of the scenario": (
        'material = "mine",', 'material = "mine", x = 0.5,',
        'stack.exit[0].layers[1].x: does not belong to "mine", which [materials] defines without one; take it out',
    ),
    "graded x": (
        "x = 0.3", "x = 0.3, x_from = 0.3, x_to = 0.1",
        "stack.cell[0].x_from: stands beside x; keep x, or x_from with x_to",
    ),
    "profile": (
        "{ delta_eV_nm = 0.1 }", '{ profile = "cosine", mass = 0.1, thickness_nm = 5 }',
        "stack.entry[0].mean_eV: is missing; a cosine profile needs mean_eV and amplitude_eV",
    ),
    "material unknown": (
        '"AlAs"', '"AlSa"',
        'stack.exit[0].layers[0].material: "AlSa" is neither in the library nor in [materials]; did you mean AlSb?',
    ),
    "material a number": ('"AlAs"', "7", "stack.exit[0].layers[0].material: must be text in quotes, but is 7"),
    "mass on a material layer": (
        "monolayers = 9", "monolayers = 9, mass = 0.1",
        "stack.cell[0].mass: does not belong to a material layer, which takes material, x, x_from, x_to, "
        "thickness_nm, monolayers, grading_nm; take it out",
    ),
    "mass missing": (
        "mass = 0.07, ", "",
        "stack.cell[1].mass: is missing; a layer given by its band edge needs a mass",
    ),
    "mass zero": ("mass = 0.07", "mass = 0", "stack.cell[1].mass: must be from 0.0001 to 1,000 m0, but is 0.0"),
    "mass too large": (
        "mass = 0.07", "mass = 1001",
        "stack.cell[1].mass: must be from 0.0001 to 1,000 m0, but is 1001.0",
    ),
    "edge too high": (
        "band_edge_eV = 0.1", "band_edge_eV = 1000.1",
        "stack.cell[1].band_edge_eV: must be from -1,000 to 1,000 eV, but is 1000.1",
    ),
    "nonparabolicity negative": (
        "mass = 0.07", "mass = 0.07, nonparabolicity_per_eV = -1",
        "stack.cell[1].nonparabolicity_per_eV: must be from 0 to 1,000 per eV, but is -1.0",
    ),
    "x just above 1": (
        "x = 0.3", "x = 1.0000000000000002",
        "stack.cell[0].x: must be from 0 to 1, but is 1.0000000000000002",
    ),
    # repeat groups
    "group in the cell": (
        "cell = [", 'cell = [ { repeat = 2, layers = [ { material = "AlAs", thickness_nm = 1 } ] },',
        "stack.cell[0].repeat: has no place in the cell, which stack.periods repeats already; write its layers out",
    ),
    "group in a group": (
        '{ material = "AlAs", thickness_nm = 1 }', "{ repeat = 2, layers = [ { delta_eV_nm = 1 } ] }",
        "stack.exit[0].layers[0].repeat: stands in another repeat group; write its layers out",
    ),
    "group without layers": (
        "{ delta_eV_nm = 0.1 }", "{ repeat = 2 }",
        "stack.entry[0].layers: is missing or empty; list the layers to repeat",
    ),
    "group of no layers": (
        "{ delta_eV_nm = 0.1 }", "{ repeat = 2, layers = [] }",
        "stack.entry[0].layers: is missing or empty; list the layers to repeat",
    ),
    "layers without repeat": (
        "{ delta_eV_nm = 0.1 }", "{ layers = [ { delta_eV_nm = 0.1 } ] }",
        "stack.entry[0]: does not say what it is; give material, or band_edge_eV and mass, or delta_eV_nm, or "
        "profile",
    ),
    "repeat zero": (
        "repeat = 2", "repeat = 0",
        "stack.exit[0].repeat: must be a whole number from 1 to 2,000, but is 0",
    ),
    "a bad layer in a group": (
        '{ material = "mine", thickness_nm = 2 }', '{ material = "mine", thickness_nm = -2 }',
        "stack.exit[0].layers[1].thickness_nm: must be above 0 and at most 10,000 nm, but is -2.0",
    ),
    "too many layers": (
        "repeat = 2", "repeat = 1000",
        "stack: holds 2,003 layers, repeat groups written out; at most 2,000 are read, so take some out",
    ),
}
