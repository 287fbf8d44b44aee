"""How far the numbers can be trusted: the sentences that the README and every report carry."""

from __future__ import annotations

LIMITS = (
    ("One band, one electron, along growth.", "Effective masses with flux-conserving matching; no other valleys, no "
     "valence band, no charging. `check` warns where an alloy is indirect, a layer strained, a value extrapolated or a "
     "window too high for one band; broken gaps and energies where a non-parabolic mass would vanish are refused."),
    ("Band offsets are known to some 20 meV at best.", "The arithmetic has ten digits and more; the sample has not."),
    ("Coherent.", "`dephasing_meV` counts every scattered electron as lost, although real samples pass many of them in "
     "sequence: what it gives is the coherent part, a lower bound. Interfaces are sharp unless graded by `grading_nm`, "
     "and every period is the same."),
    ("No bias.", "A voltage across the stack makes its cells unequal and is refused by this version."),
    ("Material values", "follow Vurgaftman, Meyer and Ram-Mohan, J. Appl. Phys. 89, 5815 (2001); each stands with its "
     "table number in `transport/materials.toml`."),
)
"""What the model leaves out, each as a heading and what it means."""

GROWTH = ("Growth uses toxic and pyrophoric gases and sources (arsine, phosphine, antimony, solid arsenic), and hot "
          "reactors. A layer list from this tool is a proposal: the rules of your site and licensed, trained practice "
          "come first.")
"""The caution on growth chemistry: what stands wherever layers leave for growth."""
