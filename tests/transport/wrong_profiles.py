"""What can be wrong with a profile layer, a graded alloy or a graded interface.

what is wrong: (the cell's first layer, the sentence)
"""

COSINE = 'profile = "cosine", mean_eV = 0.15, amplitude_eV = 0.15, mass = 0.067, thickness_nm = 8.0'
GAUSSIAN = 'profile = "gaussian", height_eV = 0.3, width_nm = 0.8, mass = 0.08, thickness_nm = 5.0'
RAMP = 'material = "AlGaAs", x_from = 0.0, x_to = 0.3, monolayers = 9'
WELL = 'material = "GaAs", thickness_nm = 6.5'
BARRIER = 'material = "AlGaAs", x = 0.3, thickness_nm = 2.5'

WRONG = {
    "no keys": ('profile = "linear", mass = 0.1, thickness_nm = 5',
                "stack.cell[0].from_eV: is missing; a linear profile needs from_eV and to_eV"),
    "half the keys": ('profile = "fermi", step_eV = 0.1, mass = 0.1, thickness_nm = 5',
                      "stack.cell[0].width_nm: is missing; a fermi profile needs step_eV and width_nm"),
    "keys of another profile": (
        COSINE + ", width_nm = 1.0",
        "stack.cell[0].width_nm: does not belong to a cosine profile, which takes profile, mass, thickness_nm, "
        "nonparabolicity_per_eV, mean_eV, amplitude_eV; take it out"),
    "a base where none is": (
        'profile = "parabola", height_eV = 0.1, width_nm = 1.0, base_eV = 0.1, mass = 0.1, thickness_nm = 5',
        "stack.cell[0].base_eV: does not belong to a parabola profile, which takes profile, mass, thickness_nm, "
        "nonparabolicity_per_eV, height_eV, width_nm; take it out"),
    "a key of a profile on a plain layer": (
        "band_edge_eV = 0.1, mass = 0.1, thickness_nm = 5, width_nm = 1.0",
        "stack.cell[0].width_nm: does not belong to a layer given by its band edge, which takes band_edge_eV, mass, "
        "thickness_nm, nonparabolicity_per_eV, grading_nm; take it out"),
    "no such profile": ('profile = "cosin", mass = 0.1, thickness_nm = 5',
                        'stack.cell[0].profile: must be one of linear, cosine, gaussian, sech2, fermi, parabola, '
                        'samples, but is "cosin"'),
    "no mass": (COSINE.replace("mass = 0.067, ", ""), "stack.cell[0].mass: is missing; a profile layer needs a mass"),
    "no thickness": (COSINE.replace(", thickness_nm = 8.0", ""), "stack.cell[0].thickness_nm: is missing; give it"),
    "monolayers": (COSINE.replace("thickness_nm", "monolayers"),
                   "stack.cell[0].monolayers: does not belong to a cosine profile, which takes profile, mass, "
                   "thickness_nm, nonparabolicity_per_eV, mean_eV, amplitude_eV; take it out"),
    "no width": (GAUSSIAN.replace("width_nm = 0.8", "width_nm = 0"),
                 "stack.cell[0].width_nm: must be from 1e-06 to 10,000 nm, but is 0.0"),
    "not a number": (GAUSSIAN.replace("0.8", "nan"),
                     "stack.cell[0].width_nm: must be from 1e-06 to 10,000 nm, but is nan"),
    "endless": (COSINE.replace("mean_eV = 0.15", "mean_eV = -inf"),
                "stack.cell[0].mean_eV: must be from -1,000 to 1,000 eV, but is -inf"),
    "one sample": ('profile = "samples", potential_eV = [0.1], mass = 0.1, thickness_nm = 5',
                   "stack.cell[0].potential_eV: must have 2 to 2,000 values, but has 1"),
    "no samples": ('profile = "samples", potential_eV = [], mass = 0.1, thickness_nm = 5',
                   "stack.cell[0].potential_eV: must have 2 to 2,000 values, but has 0"),
    "a sample that is no number": (
        'profile = "samples", potential_eV = [0.1, nan], mass = 0.1, thickness_nm = 5',
        "stack.cell[0].potential_eV[1]: must be from -1,000 to 1,000 eV, but is nan"),
    "a sample that is text": ('profile = "samples", potential_eV = [0.1, "0.2"], mass = 0.1, thickness_nm = 5',
                              'stack.cell[0].potential_eV[1]: must be a number, but is "0.2"; write it without quotes'),
    "samples that are one number": ('profile = "samples", potential_eV = 0.1, mass = 0.1, thickness_nm = 5',
                                    "stack.cell[0].potential_eV: must be a list in [ ], but is 0.1"),
    "beside a material": (WELL + ', profile = "cosine"',
                          "stack.cell[0].profile: stands beside material; keep one of them"),
    "beside a band edge": (COSINE + ", band_edge_eV = 0.1",
                           "stack.cell[0].profile: stands beside band_edge_eV; keep one of them"),
    "beyond what is an energy": (
        'profile = "parabola", height_eV = 1, width_nm = 0.1, mass = 0.1, thickness_nm = 50',
        "stack.cell[0]: reaches -62499 eV, but a band edge must be from -1,000 to 1,000 eV; give it smaller numbers"),
    "beyond what can be resolved": (
        'profile = "linear", from_eV = -1000, to_eV = 1000, mass = 1000, thickness_nm = 10000',
        "stack.cell[0]: takes more than 20,000 constant layers to be right to 1e-10; make it thinner, lower or "
        "smoother"),
    "x beside x_from": ('material = "AlGaAs", x = 0.1, x_from = 0.1, x_to = 0.3, monolayers = 9',
                        "stack.cell[0].x_from: stands beside x; keep x, or x_from with x_to"),
    "x beside x_to": ('material = "AlGaAs", x = 0.1, x_to = 0.3, monolayers = 9',
                      "stack.cell[0].x_to: stands beside x; keep x, or x_from with x_to"),
    "x_from alone": ('material = "AlGaAs", x_from = 0.1, monolayers = 9',
                     "stack.cell[0].x_to: is missing; a graded alloy runs from x_from to x_to"),
    "x_to alone": ('material = "AlGaAs", x_to = 0.1, monolayers = 9',
                   "stack.cell[0].x_from: is missing; a graded alloy runs from x_from to x_to"),
    "x_from of no alloy": ('material = "GaAs", x_from = 0.1, x_to = 0.3, monolayers = 9',
                           "stack.cell[0].x_from: does not belong to GaAs, which is no alloy of the library; take it "
                           "out, and x_to"),
    "x_from of nothing known": ('material = "AlGaSa", x_from = 0.1, x_to = 0.3, monolayers = 9',
                                'stack.cell[0].material: "AlGaSa" is neither in the library nor in [materials]; did '
                                "you mean AlGaSb?"),
    "x_from beyond 1": ('material = "AlGaAs", x_from = 0.1, x_to = 1.3, monolayers = 9',
                        "stack.cell[0].x_to: must be from 0 to 1, but is 1.3"),
    "no grading": (BARRIER + ", grading_nm = 0",
                   "stack.cell[0].grading_nm: must be from 1e-06 to 10,000 nm, but is 0.0"),
    "grading of a profile": (COSINE + ", grading_nm = 1.0",
                             "stack.cell[0].grading_nm: does not belong to a cosine profile, which takes profile, "
                             "mass, thickness_nm, nonparabolicity_per_eV, mean_eV, amplitude_eV; take it out"),
}
