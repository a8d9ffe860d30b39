"""Materials: the interpolation law by its identities, temperature, and what is refused."""

from __future__ import annotations

import dataclasses
import itertools
import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from physics.catalogue import QUANTITIES, catalogue
from physics.errors import MaterialError
from physics.formula import GROUP_III, GROUP_V
from physics.materials import MAX_TEMPERATURE_K, Material, material

NUMBERS = [
    field.name for field in dataclasses.fields(Material) if field.name not in {"name", "elastic"}
]
COMPOUNDS = [a + b for a in GROUP_III for b in GROUP_V]

shares = st.floats(0.0, 1.0)
temperatures = st.floats(0.0, 400.0)


def numbers(of: Material) -> dict[str, float]:
    return {key: getattr(of, key) for key in NUMBERS} | dataclasses.asdict(of.elastic)


def mix(cations: dict[str, float], anions: dict[str, float]) -> str:
    return "".join(f"{name}{share:.12f}" for name, share in (cations | anions).items())


def split(elements: tuple[str, ...], x: float) -> dict[str, float]:
    return dict(zip(elements, (x, 1.0 - x) if len(elements) == 2 else (1.0,), strict=True))


@pytest.mark.parametrize("name", COMPOUNDS)
def test_a_compound_has_the_values_of_its_rows(name: str) -> None:
    row, found = catalogue().binaries[name], material(name, 0.0)
    assert found.name == name
    assert found.gap_eV == row.gamma_gap_eV.zero_K_eV
    assert found.edge_eV == row.valence_offset_eV.value + row.gamma_gap_eV.zero_K_eV
    assert found.x_edge_eV == row.valence_offset_eV.value + row.x_gap_eV.zero_K_eV
    assert found.l_edge_eV == row.valence_offset_eV.value + row.l_gap_eV.zero_K_eV
    assert (found.mass, found.permittivity) == (row.mass.value, row.permittivity.value)
    assert found.monolayer_nm == 0.5 * row.lattice_nm.value
    assert material(name, 300.0).lattice_nm == row.lattice_nm.value
    for key, value in dataclasses.asdict(found.elastic).items():
        assert value == getattr(row, key).value


@pytest.mark.parametrize("name", COMPOUNDS)
@given(temperature=temperatures)
def test_an_alloy_ends_at_its_compounds(name: str, temperature: float) -> None:
    cation, anion = name[:2], name[2:]
    absent = [element for element in (*GROUP_III, *GROUP_V) if element not in {cation, anion}]
    ends = f"{cation}1{anion}1" + "".join(f"{element}0" for element in absent)
    assert material(ends, temperature) == material(name, temperature)


@given(x=shares, y=shares, temperature=temperatures)
def test_order_does_not_matter(x: float, y: float, temperature: float) -> None:
    cations = {"Al": x, "Ga": 1.0 - x}
    anions = {"As": y, "Sb": 1.0 - y}
    backward = dict(reversed(cations.items())), dict(reversed(anions.items()))
    one = numbers(material(mix(cations, anions), temperature))
    assert numbers(material(mix(*backward), temperature)) == pytest.approx(one, rel=1e-14)


@pytest.mark.parametrize(
    ("pair", "cations", "anions"),
    [
        (("AlAs", "GaAs"), ("Al", "Ga"), ("As",)),
        (("GaAs", "InAs"), ("Ga", "In"), ("As",)),
        (("AlSb", "GaSb"), ("Al", "Ga"), ("Sb",)),
        (("GaAs", "GaSb"), ("Ga",), ("As", "Sb")),
        (("InP", "InAs"), ("In",), ("P", "As")),
    ],
)
@given(x=st.floats(0.01, 0.99))
def test_a_ternary_follows_its_quadratic_law(
    pair: tuple[str, str], cations: tuple[str, ...], anions: tuple[str, ...], x: float
) -> None:
    """Q(x) = x A + (1 - x) B - x (1 - x) C(x), written out again for one pair of compounds."""
    rows = catalogue().bowings[pair]
    x = float(f"{x:.12f}")
    found = material(mix(split(cations, x), split(anions, x)), 77.0)
    first, second = material(pair[0], 77.0), material(pair[1], 77.0)
    assert set(rows) <= set(QUANTITIES)
    for quantity, ends, value in [
        ("gamma_gap_eV", (first.gap_eV, second.gap_eV), found.gap_eV),
        ("mass", (first.mass, second.mass), found.mass),
        ("permittivity", (first.permittivity, second.permittivity), found.permittivity),
        ("lattice_nm", (first.lattice_nm, second.lattice_nm), found.lattice_nm),
        ("c11_GPa", (first.elastic.c11_GPa, second.elastic.c11_GPa), found.elastic.c11_GPa),
        ("a_c_eV", (first.elastic.a_c_eV, second.elastic.a_c_eV), found.elastic.a_c_eV),
    ]:
        row = rows.get(quantity)
        bow = 0.0 if row is None else row.constant + row.per_x * x
        expected = x * ends[0] + (1.0 - x) * ends[1] - x * (1.0 - x) * bow
        assert value == pytest.approx(expected, rel=1e-11)


@given(a=st.floats(0.05, 0.9), b=st.floats(0.05, 0.9), y=shares)
def test_every_alloy_has_sane_numbers(a: float, b: float, y: float) -> None:
    """Between the compounds' extremes, but for gaps and masses, which bow."""
    x = a * (1.0 - b)
    cations = {"Al": x, "Ga": b, "In": 1.0 - x - b}
    for first, second in itertools.combinations(GROUP_V, 2):
        found = material(mix(cations, {first: y, second: 1.0 - y}), 300.0)
        assert 0.54 < found.lattice_nm < 0.65
        assert 9.0 < found.permittivity < 17.0
        assert 0.01 < found.mass < 0.22
        assert 0.05 < found.gap_eV < 3.6
        assert found.name.startswith("Al")


@pytest.mark.parametrize("temperature", [-1.0, -1e-300, 2000.1, math.inf, math.nan])
def test_temperatures_outside_are_refused(temperature: float) -> None:
    with pytest.raises(MaterialError, match=r"temperature_K is .*0 to 2000 K"):
        material("GaAs", temperature)


def test_a_closed_gap_is_refused() -> None:
    with pytest.raises(MaterialError, match="'InSb': its gap at 2000 K is -0"):
        material("InSb", MAX_TEMPERATURE_K)


@given(st.sampled_from(COMPOUNDS), st.floats(0.0, 600.0), st.floats(0.0, 600.0))
def test_gaps_shrink_and_lattices_grow_with_heat(name: str, one: float, two: float) -> None:
    cold, hot = (material(name, temperature) for temperature in sorted((one, two)))
    assert hot.gap_eV <= cold.gap_eV
    assert hot.lattice_nm >= cold.lattice_nm
    assert hot.monolayer_nm == cold.monolayer_nm


@given(st.text(max_size=20), st.floats())
def test_nothing_but_a_material_error_comes_out(text: str, temperature: float) -> None:
    message = ""
    try:
        material(text, temperature)
    except MaterialError as refusal:
        message = str(refusal)
    assert message.isprintable()
