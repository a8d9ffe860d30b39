"""Notes appear where a careful colleague would speak, and only there."""

from __future__ import annotations

from dataclasses import replace

import pytest

from physics.advice import Advice, advise, scattering_width_eV
from physics.dephasing import COHERENT, Dephasing, wells_of
from physics.field import uniform_field
from physics.levels import find_levels
from physics.spectrum import adaptive_spectrum
from physics.structure import Structure
from reference.stacks import stack, two_barriers


def notes(
    structure: Structure,
    bias: float = 0.0,
    temperature: float = 300.0,
    dephasing: Dephasing = COHERENT,
) -> list[Advice]:
    profile = uniform_field(structure, bias)
    levels = find_levels(profile, 0.0, 0.3)
    spectrum = adaptive_spectrum(profile, 0.0, 0.3, levels)
    return list(advise(structure, profile, temperature, levels, spectrum, dephasing=dephasing))


def with_layer(structure: Structure, number: int, **changes: object) -> Structure:
    layers = list(structure.layers)
    layers[number - 1] = replace(layers[number - 1], **changes)
    return replace(structure, layers=tuple(layers))


def test_nothing_to_say() -> None:
    assert notes(two_barriers()) == []


def test_side_valley_follows_the_field() -> None:
    structure = with_layer(two_barriers(), 3, x_edge_eV=0.29, name="barrier stuff")
    (note,) = notes(structure)
    assert (note.topic, note.layer) == ("side valley", 3)
    assert "X edge at 0.290 eV; no level lies above it" in note.text
    (note, *_) = notes(structure, 0.28)  # the field lowers the right face by 0.28 eV
    assert "X edge at 0.010 eV" in note.text
    assert "level 1 and up" in note.text
    assert notes(with_layer(two_barriers(), 3, x_edge_eV=0.31)) == []


@pytest.mark.parametrize(("thickness", "spoken"), [(0.5, True), (0.57, False)])
def test_thin_layer(thickness: float, spoken: bool) -> None:
    structure = with_layer(two_barriers(), 1, thickness_nm=thickness, monolayer_nm=0.283)
    topics = [note.topic for note in notes(structure)]
    assert ("thin layer" in topics) == spoken


def test_strain() -> None:
    structure = two_barriers()
    structure = replace(structure, left=replace(structure.left, lattice_nm=0.565))
    structure = with_layer(structure, 1, lattice_nm=0.571, name="wide")
    structure = with_layer(structure, 3, lattice_nm=0.5651, name="matched")
    (note,) = notes(structure)
    assert note.topic == "strain"
    assert "layer 1 (wide) is compressed by 1.06 %" in note.text


def test_coherence_depends_on_temperature() -> None:
    structure = two_barriers(4.0, 5.0, 4.0)
    assert [note.topic for note in notes(structure)] == ["coherence"]
    assert notes(structure, temperature=4.0) == []
    assert scattering_width_eV(4.0) == pytest.approx(2e-4)
    assert scattering_width_eV(0.01) == pytest.approx(2e-4)
    # About 2.5 meV at room temperature: the order of a mobility of 8000 cm^2/Vs (common practice).
    assert 1.5e-3 < scattering_width_eV(300.0) < 4e-3


def test_a_stated_dephasing_width_says_what_it_does() -> None:
    structure = two_barriers(4.0, 5.0, 4.0)
    lost = Dephasing(5e-3, wells_of(structure))
    (note,) = notes(structure, dephasing=lost)
    assert note.topic == "coherence"
    level = find_levels(uniform_field(structure), 0.0, 0.3).levels[0]
    total = level.width_eV + lost.of_level_eV(level.share_by_layer)
    assert f"level 1, the narrowest, is {1e3 * total:.3g} meV wide in all" in note.text
    assert f"by a factor of {total / level.width_eV:.3g};" in note.text


def test_a_dephasing_width_without_a_well_is_said_to_do_nothing() -> None:
    structure = stack([(2.0, 0.3, 0.09)])
    (note,) = notes(structure, dephasing=Dephasing(5e-3, wells_of(structure)))
    assert note.topic == "coherence"
    assert "T is coherent" in note.text


def test_a_level_narrower_than_any_double() -> None:
    structure = stack([(160.0, 1.0, 0.3), (5.0, 0.0, 0.067), (150.0, 1.0, 0.3)])
    (note,) = notes(structure, dephasing=Dephasing(1e-3, wells_of(structure)))
    assert "its peak lower by a factor of 1e" in note.text


def test_permittivity() -> None:
    structure = with_layer(two_barriers(), 1, permittivity=10.0)
    assert notes(structure) == []  # no field, nothing shared
    assert [note.topic for note in notes(structure, 0.1)] == ["permittivity"]


def test_unproved_and_unconserved_are_said() -> None:
    structure = stack([(2.0, 0.3, 0.09)])
    profile = uniform_field(structure)
    levels = replace(find_levels(profile, 0.0, 0.3), complete=False)
    spectrum = adaptive_spectrum(profile, 0.0, 0.3, levels)
    spoilt = replace(spectrum, reflection=spectrum.reflection + 1e-6)
    topics = [note.topic for note in advise(structure, profile, 300.0, levels, spoilt)]
    assert topics == ["proof", "flux"]
