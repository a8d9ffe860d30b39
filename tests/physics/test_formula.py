"""Formulas: what is read, what is refused, and that nothing else ever comes out."""

from __future__ import annotations

import itertools

import pytest
from hypothesis import given
from hypothesis import strategies as st

from physics.errors import MaterialError
from physics.formula import GROUP_III, GROUP_V, MAX_LENGTH, parse_formula


@pytest.mark.parametrize(
    ("formula", "cations", "anions", "name"),
    [
        ("GaAs", {"Ga": 1.0}, {"As": 1.0}, "GaAs"),
        ("  GaAs ", {"Ga": 1.0}, {"As": 1.0}, "GaAs"),
        ("Al0.3Ga0.7As", {"Al": 0.3, "Ga": 0.7}, {"As": 1.0}, "Al0.3Ga0.7As"),
        ("Al.3Ga.7As1", {"Al": 0.3, "Ga": 0.7}, {"As": 1.0}, "Al0.3Ga0.7As"),
        ("Al0.3GaAs", {"Al": 0.3, "Ga": 0.7}, {"As": 1.0}, "Al0.3Ga0.7As"),
        ("InGa0.47As", {"Ga": 0.47, "In": 0.53}, {"As": 1.0}, "In0.53Ga0.47As"),
        ("GaAs0.51Sb", {"Ga": 1.0}, {"As": 0.51, "Sb": 0.49}, "GaAs0.51Sb0.49"),
        ("GaSb0.49As0.51", {"Ga": 1.0}, {"As": 0.51, "Sb": 0.49}, "GaSb0.49As0.51"),
        (
            "In0.53Ga0.2Al0.27As",
            {"Al": 0.27, "Ga": 0.2, "In": 0.53},
            {"As": 1.0},
            "In0.53Ga0.2Al0.27As",
        ),
        (
            "In0.8Ga0.2As0.43P0.57",
            {"Ga": 0.2, "In": 0.8},
            {"P": 0.57, "As": 0.43},
            "In0.8Ga0.2As0.43P0.57",
        ),
        (
            "(Al0.4Ga0.6)0.5In0.5P",
            {"Al": 0.2, "Ga": 0.3, "In": 0.5},
            {"P": 1.0},
            "Al0.2Ga0.3In0.5P",
        ),
        (
            "In0.52(Al0.5Ga)As",
            {"Al": 0.24, "Ga": 0.24, "In": 0.52},
            {"As": 1.0},
            "In0.52Al0.24Ga0.24As",
        ),
        ("Al0Ga1As", {"Ga": 1.0}, {"As": 1.0}, "GaAs"),
    ],
)
def test_people_write_them_so(
    formula: str, cations: dict[str, float], anions: dict[str, float], name: str
) -> None:
    composition = parse_formula(formula)
    assert dict(composition.cations) == pytest.approx(cations, abs=1e-15)
    assert dict(composition.anions) == pytest.approx(anions, abs=1e-15)
    assert composition.name == name


@pytest.mark.parametrize(
    ("formula", "found"),
    [
        ("", "found nothing"),
        ("   ", "found nothing"),
        ("Ga" * 41, "82 characters"),
        ("gaas", "can't read 'gaas'"),
        ("Ga As", "can't read ' As'"),
        ("Al-0.3Ga1.3As", "can't read '-0.3Ga1.3As'"),
        ("Al0.3.1Ga0.7As", "can't read '.1Ga0.7As'"),
        ("GaAs1e0", "can't read 'e0'"),
        ("InAs\u0663", "can't read '\u0663'"),
        ("SiGe", "'Si' is not in the catalogue"),
        ("GaN", "'N' is not in the catalogue"),
        ("MyAlloy", "'My' is not in the catalogue"),
        ("Al1.2GaAs", "fraction 1.2"),
        ("Ga", "no element of group V"),
        ("As", "no element of group III"),
        ("Al0.3Ga0.8As", "group III fractions sum to 1.1"),
        ("GaAs0.5Sb0.49", "group V fractions sum to 0.99"),
        ("Al0.3Ga0.700002As", "group III fractions sum to 1.000002"),
        ("AlGaAs", "2 of the group III fractions are missing"),
        ("In0.53Ga0.47AlAs", "nothing is left for the one that is missing"),
        ("Ga0.5Ga0.5As", "Ga appears twice"),
        ("Al0.5(Al0.5Ga0.5)0.5As", "Al appears twice"),
        ("()GaAs", "bracket's fractions sum to 0"),
        ("(GaAs)0.5", "2 of the bracket's fractions are missing"),
        ("(Ga0.5As0.5)In", "elements of both groups"),
        ("((Ga)1)As", "can't read"),
        ("(GaAs", "can't read '(GaAs'"),
    ],
)
def test_refusals_say_what_was_found(formula: str, found: str) -> None:
    with pytest.raises(MaterialError) as refusal:
        parse_formula(formula)
    assert found in str(refusal.value)
    assert "; " in str(refusal.value), "the remedy is missing"


def test_a_sum_may_miss_one_by_a_millionth() -> None:
    composition = parse_formula("Al0.333333Ga0.333333In0.333333As")
    assert sum(fraction for _, fraction in composition.cations) == pytest.approx(1.0, abs=1e-15)


@pytest.mark.parametrize(
    "bad", ["Ga\x1b[2JAs", "GaAs\n", "\x07", "GaAs\u202e", "Ga\ud800As", "\x9b"]
)
def test_control_characters_never_come_back_raw(bad: str) -> None:
    with pytest.raises(MaterialError) as refusal:
        parse_formula(bad)
    assert str(refusal.value).isprintable()


PIECES = [
    *GROUP_III,
    *GROUP_V,
    "0.3",
    "0.7",
    "1",
    "0",
    ".",
    "(",
    ")",
    " ",
    "N",
    "0.000001",
    "-",
    "e",
]


@given(
    st.text(max_size=MAX_LENGTH + 5)
    | st.lists(st.sampled_from(PIECES), max_size=14).map("".join)
    | st.from_regex(r"\A(Al|Ga|In|P|As|Sb|\(|\)|0?\.[0-9]{1,3}|1){1,10}\Z")
)
def test_a_formula_is_read_or_refused(text: str) -> None:
    message = ""
    try:
        composition = parse_formula(text)
    except MaterialError as refusal:
        message = str(refusal)
    assert message.isprintable()
    if message:
        return
    for sublattice in (composition.cations, composition.anions):
        assert sum(fraction for _, fraction in sublattice) == pytest.approx(1.0, abs=1e-14)
        assert all(0.0 < fraction <= 1.0 for _, fraction in sublattice)
    again = parse_formula(composition.name)
    assert dict(again.cations) == pytest.approx(dict(composition.cations), abs=3e-9)


def test_the_order_of_the_elements_does_not_matter() -> None:
    parts = ["In0.53", "Ga0.2", "Al0.27", "As0.9", "P0.1"]
    readings = {
        (reading.cations, reading.anions)
        for reading in (parse_formula("".join(order)) for order in itertools.permutations(parts))
    }
    assert len(readings) == 1
