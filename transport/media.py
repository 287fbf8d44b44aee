"""What a layer or lead is made of, on the one energy scale of a document.

Explicit edges and those of materials the scenario defines share one scale. If the left lead is a library material,
its edge is the zero of that scale and library edges follow from the library's offsets; beside any other left lead
a library material has no known offset and is refused.
"""

from __future__ import annotations

from dataclasses import dataclass

from transport import materials
from transport.document import Document, LayerRecord, LeadRecord, UserMaterial
from transport.materials import Material
from transport.refusal import ScenarioError, nearest, refuse_unless, shown


@dataclass(frozen=True, slots=True)
class Edges:
    """Valence and conduction edge (eV, from the valence edge of InSb) of the material called `label`, unstrained.

    Unstrained, because the library does not know how strain moves a valence edge.
    """

    label: str
    valence: float
    conduction: float


@dataclass(frozen=True, slots=True)
class Medium:
    """`material` (None where only an edge is given) with `band_edge` on the document's scale (eV), `mass` (m0),
    `nonparabolicity` (1/eV) and, where they are known, `monolayer` (nm), `base`: what an alloy is at x = 0, and
    `faces`: the edges of a library material at its left and right face."""

    material: str | None
    x: float | None
    band_edge: float
    mass: float
    nonparabolicity: float
    monolayer: float | None = None
    warnings: tuple[str, ...] = ()
    base: str | None = None
    faces: tuple[Edges, Edges] | None = None


class Media:
    """Looks up media for one document; `library` collects the labels of the library materials met."""

    def __init__(self, document: Document) -> None:
        self._conditions = document.conditions
        self._users = {entry.name: entry for entry in document.materials}
        self.library: set[str] = set()
        self._substrate = self._find_substrate()
        left = document.leads.left
        self._zero: Material | None = None
        if left.material is not None and left.material not in self._users:
            self._zero = self._find("leads.left", left.material, left.x)

    def medium(self, key: str, record: LayerRecord | LeadRecord) -> Medium:
        """The medium of a layer or lead that stands at `key`. Raises ScenarioError."""
        if record.material is None:
            assert record.band_edge_eV is not None and record.mass is not None
            return Medium(None, None, record.band_edge_eV, record.mass, record.nonparabolicity_per_eV or 0.0)
        if record.material in self._users:
            return self._of_the_scenario(key, self._users[record.material], record.x)
        return self._of_the_library(key, record.material, record.x)

    def is_graded(self, name: str) -> bool:
        """Whether a material may run through compositions: an alloy of the library, and not one of the scenario's."""
        return name not in self._users and (name not in materials.material_names() or materials.is_alloy(name))

    def _find_substrate(self) -> Material | None:
        name = self._conditions.substrate
        if name is None:
            return None
        known = materials.substrate_names()
        if name not in known:
            raise ScenarioError("conditions.substrate",
                                f"{shown(name)} is not a substrate of the library; {nearest(name, known)}")
        return self._at_temperature(name, None, None)

    def _find(self, key: str, name: str, x: float | None) -> Material:
        known = materials.material_names()
        if name not in known:
            remedy = nearest(name, (*known, *self._users))
            raise ScenarioError(f"{key}.material",
                                f"{shown(name)} is neither in the library nor in [materials]; {remedy}")
        if materials.is_alloy(name):
            refuse_unless(x is not None, f"{key}.x", f"is missing; {name} is an alloy, give its share from 0 to 1")
        else:
            refuse_unless(x is None, f"{key}.x", f"does not belong to {name}, which is no alloy; take it out")
        return self._at_temperature(name, x, self._conditions.substrate)

    def _at_temperature(self, name: str, x: float | None, substrate: str | None) -> Material:
        temperature = self._conditions.temperature_K
        try:
            return materials.material(name, x, temperature, substrate)
        except materials.GapClosedError as error:
            raise ScenarioError("conditions.temperature_K", str(error)) from None

    def _of_the_library(self, key: str, name: str, x: float | None) -> Medium:
        found = self._find(key, name, x)
        if self._zero is None:
            raise ScenarioError(
                f"{key}.material", f"{name} has no known offset from a left lead that is not of the library; give "
                f"[materials.{name}] a band_edge_eV and mass, or the left lead a library material")
        self.library.add(found.label)
        nonparabolicity = 1 / found.gap if self._conditions.nonparabolic else 0.0
        edges = Edges(found.label, found.valence_edge, found.valence_edge + found.gap)
        return Medium(name, x, found.band_edge - self._zero.band_edge, found.mass, nonparabolicity, found.monolayer,
                      (*found.warnings, *self._mismatch_warning(found)), materials.base_of(name), (edges, edges))

    def _mismatch_warning(self, found: Material) -> tuple[str, ...]:
        reference = self._substrate or self._zero
        assert reference is not None
        share = materials.mismatch(found, reference)
        if abs(share) <= materials.LARGEST_MISMATCH:
            return ()
        strain = "its strain is counted, but a thick layer relaxes"
        if self._substrate is None:
            strain = "its strain is not counted, because the scenario names no substrate"
        return (f"The lattice constant of {found.label} differs from that of {reference.label} by "
                f"{abs(share) * 100:.2g} %: {strain}.",)

    def _of_the_scenario(self, key: str, entry: UserMaterial, x: float | None) -> Medium:
        """A material of [materials.NAME]. One that takes an alloy's name may stand with an x, which says nothing."""
        name = entry.name
        renamed = name in materials.material_names() and materials.is_alloy(name)
        refuse_unless(x is None or renamed, f"{key}.x",
                      f"does not belong to {shown(name)}, which [materials] defines without one; take it out")
        warnings = []
        if x is not None:
            warnings.append(f"{name} is as [materials.{name}] says, whatever its x.")
        nonparabolicity = 0.0
        if self._conditions.nonparabolic:
            if entry.nonparabolicity_per_eV is not None:
                nonparabolicity = entry.nonparabolicity_per_eV
            elif entry.gap_eV is not None:
                nonparabolicity = 1 / entry.gap_eV
            else:
                warnings.append(f"{name} has neither gap_eV nor nonparabolicity_per_eV: its mass stays constant.")
        return Medium(name, x, entry.band_edge_eV, entry.mass, nonparabolicity, entry.monolayer_nm, tuple(warnings))
