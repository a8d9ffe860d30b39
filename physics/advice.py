"""What a careful colleague would add to the answer.

Each note names what was seen and what it means for the numbers. None of them changes a number.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from physics.constants import BOLTZMANN_EV_PER_K
from physics.dephasing import COHERENT, Dephasing
from physics.field import ASSUMED_PERMITTIVITY, Profile
from physics.levels import LevelSet
from physics.scattering import Scattering
from physics.screening import ScreeningReport
from physics.strain_notes import strain_notes
from physics.structure import Layer, Structure

THIN_MONOLAYERS = 2.0
"""Below this an effective mass and a sharp edge mean little (common practice)."""
FLUX_TOLERANCE = 1e-10
"""Largest |T + R - 1| that is put down to rounding."""
MOST_WRITTEN_OUT = 4
"""Level numbers in one note before a range says as much."""
PHONON_EV = 0.036
"""Energy of the longitudinal optical phonon of GaAs (handbook value, from memory)."""
SCATTERING_AT_0K_EV = 2e-4
"""Broadening left at low temperature by interfaces and impurities (common practice)."""
PHONON_COUPLING_EV = 7e-3
"""Broadening per phonon present: order of magnitude after S. Rudin, T. L. Reinecke and B. Segall,
Phys. Rev. B 42, 11218 (1990), from memory."""


@dataclass(frozen=True)
class Advice:
    """One note with the answer."""

    topic: str
    """One of: side valley, thin layer, strain, coherence, flux, permittivity, proof,
    accuracy, screening."""
    text: str
    layer: int | None = None
    """Number of the layer it speaks of, counted from 1; None where it is about the whole."""


def advise(
    structure: Structure,
    profile: Profile,
    temperature_K: float,
    levels: LevelSet,
    spectrum: Scattering,
    *,
    dephasing: Dephasing = COHERENT,
    screening: ScreeningReport | None = None,
) -> tuple[Advice, ...]:
    """Collect the notes on one answer.

    Parameters
    ----------
    structure : Structure
        The stack, with side valleys and lattice constants where they are known.
    profile : Profile
        The same with its field.
    temperature_K : float
        Lattice and carrier temperature.
    levels, spectrum
        The answer.
    dephasing : Dephasing
        How coherence was lost in it.
    screening : ScreeningReport, optional
        How the field was solved, where it is the screened one.
    """
    stated = dephasing.width_eV > 0.0
    notes = [
        *_screening(screening),
        *_proof(levels),
        *_pairs(levels),
        *_flux(spectrum),
        *_side_valleys(structure, profile, levels, float(spectrum.energy_eV.max())),
        *_thin(structure),
        *_strain(structure),
        *(_lost(levels, dephasing) if stated else _coherence(levels, temperature_K)),
        *_permittivity(structure, profile, screened=screening is not None),
    ]
    return tuple(notes)


def structure_notes(structure: Structure) -> tuple[Advice, ...]:
    """Collect the notes on the layers themselves, whatever is computed of them."""
    return (*_thin(structure), *_strain(structure))


def scattering_width_eV(temperature_K: float) -> float:
    """Broadening that scattering adds to a level at a temperature; an order of magnitude."""
    ratio = PHONON_EV / (BOLTZMANN_EV_PER_K * temperature_K)
    phonons = math.exp(-ratio) / -math.expm1(-ratio)  # Bose's number, without overflow when cold
    return SCATTERING_AT_0K_EV + PHONON_COUPLING_EV * phonons


def _screening(report: ScreeningReport | None) -> list[Advice]:
    if report is None:
        return []
    state = (
        f"residual {report.residual:.0e}, neutral to {report.neutrality:.0e}, edge good to "
        f"{1e3 * report.mesh_error_eV:.2g} meV"
    )
    if not report.converged:
        state = f"NOT CONVERGED, trust no number below: {report.reason}"
    return [Advice("screening", f"{report.model}; {state}")]


def _proof(levels: LevelSet) -> list[Advice]:
    if levels.complete:
        return []
    text = (
        f"the count of levels up to {levels.max_width_eV:g} eV wide could not be proved, broad "
        "ones may be missing; a smaller largest width can often be proved"
    )
    return [Advice("proof", text)]


def _pairs(levels: LevelSet) -> list[Advice]:
    if levels.accurate:
        return []
    numbers = [
        number
        for number, level in enumerate(levels.levels, start=1)
        if level.width_error > levels.STATED_WIDTH_ERROR
    ]
    worst = max(level.width_error for level in levels.levels)
    text = (
        f"levels {_numbers(numbers)} all but coincide: how they share their wells, and with it "
        f"their widths, is known to about {min(worst, 1.0):.0e} only"
    )
    return [Advice("accuracy", text)]


def _flux(spectrum: Scattering) -> list[Advice]:
    worst = float(np.max(np.abs(spectrum.transmission + spectrum.reflection - 1.0)))
    if worst <= FLUX_TOLERANCE:
        return []
    return [
        Advice("flux", f"T + R differs from 1 by up to {worst:.1e}; trust no digit beyond that")
    ]


def _side_valleys(
    structure: Structure, profile: Profile, levels: LevelSet, top_eV: float
) -> list[Advice]:
    """One note a material and valley, on its lowest layer in energy."""
    lowest: dict[tuple[str, str], tuple[float, int]] = {}
    for number, layer in enumerate(structure.layers, start=1):
        lowered = _lowered_eV(layer, profile, number - 1)
        for valley, edge in (("X", layer.x_edge_eV), ("L", layer.l_edge_eV)):
            if edge is None or edge - lowered >= top_eV:
                continue
            key = (valley, layer.name)
            lowest[key] = min(lowest.get(key, (math.inf, 0)), (edge - lowered, number))
    return [
        Advice("side valley", _side_valley_text(valley, name, edge, number, levels), number)
        for (valley, name), (edge, number) in lowest.items()
    ]


def _lowered_eV(layer: Layer, profile: Profile, index: int) -> float:
    """How far the field lowers a layer, at the face where it does so most."""
    pieces = profile.layer_pieces(index)
    face = profile.position_nm[pieces.start : pieces.stop + 1]
    share = (face - face[0]) / (face[-1] - face[0])
    edge = layer.edge_eV * (1.0 - share) + layer.right_edge_eV * share
    left = edge[:-1] - profile.edge_left_eV[pieces]
    right = edge[1:] - profile.edge_right_eV[pieces]
    return float(max(left.max(), right.max()))


def _side_valley_text(valley: str, name: str, edge_eV: float, number: int, levels: LevelSet) -> str:
    above = [n for n, level in enumerate(levels.levels, start=1) if level.energy_eV > edge_eV]
    who = f"level {above[0]} and up lie above it" if above else "no level lies above it"
    where = f"layer {number}" + (f" ({name})" if name else "")
    return f"{where}: {valley} edge at {edge_eV:.3f} eV; {who}; only the Gamma band is computed"


def _thin(structure: Structure) -> list[Advice]:
    notes = []
    for number, layer in enumerate(structure.layers, start=1):
        if layer.monolayer_nm is None:
            continue
        monolayers = layer.thickness_nm / layer.monolayer_nm
        if monolayers < THIN_MONOLAYERS * (1.0 - 1e-9):
            text = (
                f"layer {number} is {monolayers:.2f} monolayers thick; below two, a band edge and "
                "an effective mass mean little"
            )
            notes.append(Advice("thin layer", text, number))
    return notes


def _strain(structure: Structure) -> list[Advice]:
    return [Advice("strain", text, number) for text, number in strain_notes(structure)]


def _coherence(levels: LevelSet, temperature_K: float) -> list[Advice]:
    limit = scattering_width_eV(temperature_K)
    narrow = [
        number
        for number, level in enumerate(levels.levels, start=1)
        if level.kind == "quasi-bound" and level.width_eV < limit
    ]
    if not narrow:
        return []
    text = (
        f"narrower than scattering allows at {temperature_K:g} K (about {1e3 * limit:.2g} meV): "
        f"level {_numbers(narrow)}; a measured line is wider and its peak lower"
    )
    return [Advice("coherence", text)]


def _lost(levels: LevelSet, dephasing: Dephasing) -> list[Advice]:
    """Say what a stated dephasing width does to the narrowest level, or why it does nothing."""
    if not dephasing.acts:
        text = "no layer lies between two higher ones, so no coherence is lost: T is coherent"
        return [Advice("coherence", text)]
    pairs = enumerate(levels.levels, start=1)
    lines = [(level, n) for n, level in pairs if level.peak_transmission > 0.0]
    if not lines:
        return []
    level, number = min(lines, key=lambda pair: pair[0].log10_width_eV)
    gained = dephasing.of_level_eV(level.share_by_layer)
    total = level.width_eV + gained
    fall = (math.log10(total) if total > 0.0 else level.log10_width_eV) - level.log10_width_eV
    text = (
        f"T counts {1e3 * dephasing.width_eV:.3g} meV of lost coherence in wells: level {number}, "
        f"the narrowest, is {1e3 * total:.3g} meV wide in all, its peak lower by a factor of "
        f"{_factor(fall)}; levels, phases and dwell times are those of the coherent wave"
    )
    return [Advice("coherence", text)]


def _factor(decades: float) -> str:
    """Write a factor, however large."""
    return f"{10.0**decades:.3g}" if decades < 300.0 else f"1e{decades:.0f}"


def _numbers(numbers: list[int]) -> str:
    """Write a few numbers out, many as a range."""
    if len(numbers) <= MOST_WRITTEN_OUT:
        return ", ".join(str(number) for number in numbers)
    return f"{numbers[0]} to {numbers[-1]} ({len(numbers)} of them)"


def _permittivity(structure: Structure, profile: Profile, *, screened: bool) -> list[Advice]:
    dropped = screened or profile.contact_edge_eV[1] != structure.right.edge_eV
    stated = {layer.permittivity for layer in structure.layers}
    if screened:
        stated |= {structure.left.permittivity, structure.right.permittivity}
    if not dropped or None not in stated or stated <= {None, ASSUMED_PERMITTIVITY}:
        return []
    text = (
        f"layers that state no permittivity share the field as if it were {ASSUMED_PERMITTIVITY:g}"
    )
    if screened:
        text = f"what states no permittivity is taken to have {ASSUMED_PERMITTIVITY:g}"
    return [Advice("permittivity", text)]
