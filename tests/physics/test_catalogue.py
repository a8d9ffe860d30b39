"""The catalogue's file: complete, with a source beside each value, and checked when it is read."""

from __future__ import annotations

from importlib import resources

import pytest

from physics.catalogue import Gap, catalogue, gap_eV, read_catalogue
from physics.errors import MaterialError

TEXT = resources.files("physics").joinpath("catalogue.toml").read_text(encoding="utf-8")


def test_it_is_read_once() -> None:
    assert catalogue() is catalogue()


def test_the_nine_compounds_are_there() -> None:
    expected = {"GaAs", "AlAs", "InAs", "InP", "GaSb", "AlSb", "InSb", "GaP", "AlP"}
    assert set(catalogue().binaries) == expected


def test_each_source_is_used_and_says_where_it_was_published() -> None:
    used = {row.source for bowings in catalogue().bowings.values() for row in bowings.values()}
    for binary in catalogue().binaries.values():
        used |= {value.source for value in vars(binary).values()}
    assert used == set(catalogue().sources)
    assert all("(19" in text or "(20" in text for text in catalogue().sources.values())


GAAS_MASS = 'mass                   = { value = 0.067, source = "vurgaftman_2001" }\n'


@pytest.mark.parametrize(
    ("old", "new", "found"),
    [
        (TEXT, "not toml", "correct the TOML"),
        (TEXT, "[source]\n[binary]\n", "'bowing' is missing"),
        (TEXT, "source = 1\n[binary]\n[bowing]\n", "[source]: found 1"),
        ("[binary.InSb]", "[binary.InBi]", "[binary]: 'InSb' is missing"),
        (GAAS_MASS, "", "[binary.GaAs]: 'mass' is missing"),
        (GAAS_MASS, GAAS_MASS + "colour = 1\n", "[binary.GaAs]: 'colour' is unknown"),
        (GAAS_MASS, "mass = 0.067\n", "[binary.GaAs] mass: found 0.067; a table belongs here"),
        ("value = 0.067,", 'value = "a",', "[binary.GaAs] mass: value is 'a'"),
        ("value = 0.067,", "value = nan,", "[binary.GaAs] mass: value is nan"),
        ("value = 0.067,", "value = true,", "[binary.GaAs] mass: value is True"),
        ("value = 0.565325,", "value = 5.65325,", "lattice_nm: value is 5.65325"),
        ('0.067, source = "vurgaftman_2001"', '0.067, source = "x"', "mass: source is 'x'"),
        ('0.067, source = "vurgaftman_2001"', "0.067, source = []", "mass: source is []"),
        ('law = "coth"', 'law = "tanh"', "[binary.GaP] gamma_gap_eV: law is 'tanh'"),
        ('law = "coth"', 'law = "linear"', "'alpha_meV_per_K' is missing"),
        ('law = "coth"', 'law = ["coth"]', "law is ['coth']"),
        ("[bowing.AlAs-GaAs]", "[bowing.GaAs-AlAs]", "found 'GaAs-AlAs'"),
        ("[bowing.AlAs-GaAs]", "[bowing.AlAs-GaSb]", "found 'AlAs-GaSb'"),
        ("C_per_x = 1.310", "C_per_y = 1.310", "'C_per_y' is unknown"),
    ],
)
def test_a_broken_catalogue_is_refused_by_name(old: str, new: str, found: str) -> None:
    assert old in TEXT
    with pytest.raises(MaterialError) as refusal:
        read_catalogue(TEXT.replace(old, new))
    assert found in str(refusal.value)
    assert str(refusal.value).startswith("catalogue.toml: ")


@pytest.mark.parametrize(
    ("gap", "temperature", "expected"),
    [
        # By hand: 1.5 - 5e-4 * 300^2 / 500 = 1.41, and 2.0 - 4e-4 * 300 = 1.88.
        (Gap("varshni", 1.5, 5e-4, 200.0, ""), 300.0, 1.41),
        (Gap("varshni", 1.5, 5e-4, 200.0, ""), 0.0, 1.5),
        (Gap("linear", 2.0, 4e-4, 0.0, ""), 300.0, 1.88),
        # coth(1) = 1.3130352854993313 (NIST Digital Library of Mathematical Functions, 4.29).
        (Gap("coth", 2.9, 0.1, 150.0, ""), 150.0, 2.9 - 0.03130352854993313),
        (Gap("coth", 2.9, 0.1, 150.0, ""), 0.0, 2.9),
        (Gap("coth", 2.9, 0.1, 150.0, ""), 1e-9, 2.9),
    ],
)
def test_gap_laws(gap: Gap, temperature: float, expected: float) -> None:
    assert gap_eV(gap, temperature) == pytest.approx(expected, rel=1e-15)
