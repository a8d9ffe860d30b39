"""Formulas to band edge, mass, permittivity and lattice constant at a temperature.

One interpolation law serves every quantity Q of an alloy with cation fractions x_i and anion
fractions y_k::

    Q = sum_ik x_i y_k Q_ik  -  sum_(i<j) x_i x_j sum_k y_k C_ij,k
                             -  sum_(k<l) y_k y_l sum_i x_i C_i,kl

where Q_ik are the values of the binary compounds and C the bowings of the ternary alloys: 0 where
none is published, always so for lattice, permittivity and elastic constants. For a ternary alloy it
is the usual quadratic law; for two cations and two anions that of R. L. Moon, G. A. Antypas and
L. W. James, J. Electron. Mater. 3, 635 (1974), from memory. A bowing that depends on the
composition, C + C' x, is taken at the point of the ternary's line that lies closest to the alloy,
x = (1 + x_i - x_j) / 2, as T. H. Glisson et al. do, J. Electron. Mater. 7, 1 (1978), from memory;
the law stays a polynomial and is the ternary's own on that line.

Temperature acts on the gaps and lattice constants of the compounds; bowing, valence offset and
mass are independent of it, as in the review that most of the catalogue comes from
(I. Vurgaftman, J. R. Meyer and L. R. Ram-Mohan, J. Appl. Phys. 89, 5815 (2001)).

Where it is rough:

- Quaternary alloys have no bowing of their own here. For alloys matched to InP the law lies within
  0.02 eV of the measured gaps of InGaAsP (R. E. Nahory et al., Appl. Phys. Lett. 33, 659 (1978))
  and of AlGaInAs (D. Olego et al., Appl. Phys. Lett. 41, 476 (1982)); with antimony, where the
  ternary bowings themselves are uncertain by 0.1 eV and more, expect no better than that.
- The edges are those of unstrained crystals; `physics.strain` moves them.
- The lattice constant's slope holds around 300 K; towards 0 K the true expansion vanishes.
- Alloys whose gap the laws close (InSb far above room temperature) are refused.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from itertools import combinations

from physics.catalogue import Binary, Pair, catalogue, gap_eV
from physics.errors import MaterialError
from physics.formula import Composition, parse_formula

MAX_TEMPERATURE_K = 2000.0
REFERENCE_TEMPERATURE_K = 300.0
"""Temperature of the catalogue's lattice constants; monolayers are counted at it."""


@dataclass(frozen=True)
class Elastic:
    """What a material's response to strain depends on; signs as in `physics.strain`."""

    c11_GPa: float
    c12_GPa: float
    c44_GPa: float
    a_c_eV: float
    a_v_eV: float
    b_eV: float


@dataclass(frozen=True)
class Material:
    """A material at one temperature; None where a user's own material does not say."""

    name: str
    """The formula with all fractions written out, or the user's own name."""
    edge_eV: float
    """Conduction-band edge at Gamma: valence offset plus gap, on the catalogue's scale."""
    mass: float
    """Electron mass at Gamma, in m0."""
    permittivity: float | None = None
    """Static relative permittivity."""
    lattice_nm: float | None = None
    """Lattice constant at the temperature asked for, unstrained."""
    monolayer_nm: float | None = None
    """Half the lattice constant at 300 K: one monolayer in a (001) stack."""
    gap_eV: float | None = None
    """Gap at Gamma."""
    x_edge_eV: float | None = None
    """Conduction-band edge at X, on the scale of ``edge_eV``."""
    l_edge_eV: float | None = None
    """Conduction-band edge at L, on the scale of ``edge_eV``."""
    elastic: Elastic | None = None


def material(formula: str, temperature_K: float = REFERENCE_TEMPERATURE_K) -> Material:
    """Look up a compound or an alloy.

    Parameters
    ----------
    formula : str
        As `physics.formula.parse_formula` reads it: ``"Al0.3Ga0.7As"``.
    temperature_K : float
        Lattice temperature, 0 to 2000 K.

    Returns
    -------
    Material
        Every field is filled in.

    Raises
    ------
    MaterialError
        The formula can't be read, the temperature is outside its range, or no gap is left at it.
    """
    _require_temperature(temperature_K)
    mixture = _mixture(parse_formula(formula))
    gamma = _mixed(mixture, "gamma_gap_eV", lambda row: gap_eV(row.gamma_gap_eV, temperature_K))
    x = _mixed(mixture, "x_gap_eV", lambda row: gap_eV(row.x_gap_eV, temperature_K))
    l_gap = _mixed(mixture, "l_gap_eV", lambda row: gap_eV(row.l_gap_eV, temperature_K))
    valence = _mixed(mixture, "valence_offset_eV", lambda row: row.valence_offset_eV.value)
    lattice = _mixed(mixture, "lattice_nm", lambda row: row.lattice_nm.value)
    slope = _mixed(mixture, "lattice_slope_nm_per_K", lambda row: row.lattice_slope_nm_per_K.value)
    _require_gap(mixture.name, temperature_K, gamma)
    return Material(
        name=mixture.name,
        edge_eV=valence + gamma,
        mass=_mixed(mixture, "mass", lambda row: row.mass.value),
        permittivity=_mixed(mixture, "permittivity", lambda row: row.permittivity.value),
        lattice_nm=lattice + slope * (temperature_K - REFERENCE_TEMPERATURE_K),
        monolayer_nm=0.5 * lattice,
        gap_eV=gamma,
        x_edge_eV=valence + x,
        l_edge_eV=valence + l_gap,
        elastic=_elastic(mixture),
    )


def _elastic(mixture: _Mixture) -> Elastic:
    return Elastic(
        c11_GPa=_mixed(mixture, "c11_GPa", lambda row: row.c11_GPa.value),
        c12_GPa=_mixed(mixture, "c12_GPa", lambda row: row.c12_GPa.value),
        c44_GPa=_mixed(mixture, "c44_GPa", lambda row: row.c44_GPa.value),
        a_c_eV=_mixed(mixture, "a_c_eV", lambda row: row.a_c_eV.value),
        a_v_eV=_mixed(mixture, "a_v_eV", lambda row: row.a_v_eV.value),
        b_eV=_mixed(mixture, "b_eV", lambda row: row.b_eV.value),
    )


def _require_temperature(temperature_K: float) -> None:
    # Written so that nan, which compares false with everything, is refused.
    if not 0.0 <= temperature_K <= MAX_TEMPERATURE_K:
        allowed = f"a temperature lies from 0 to {MAX_TEMPERATURE_K:g} K"
        raise MaterialError(f"temperature_K is {temperature_K!r}; {allowed}")


def _require_gap(name: str, temperature_K: float, gap: float) -> None:
    if gap <= 0.0:
        raise MaterialError(
            f"material {name!r}: its gap at {temperature_K:g} K is {gap:.3g} eV; "
            "a conduction band needs a gap above 0, so take a lower temperature"
        )


@dataclass(frozen=True)
class _Mixture:
    """The weights of the interpolation law for one composition."""

    name: str
    corners: tuple[tuple[Binary, float], ...]
    """Compounds and their x_i y_k."""
    sides: tuple[tuple[Pair, float, float], ...]
    """Pairs of compounds, their x_i x_j y_k, and the x at which their bowing is taken."""


def _mixture(composition: Composition) -> _Mixture:
    binaries = catalogue().binaries
    cations, anions = composition.cations, composition.anions
    sides = [
        ((i + k, j + k), xi * xj * yk, 0.5 * (1.0 + xi - xj))
        for (i, xi), (j, xj) in combinations(cations, 2)
        for k, yk in anions
    ]
    sides += [
        ((i + k, i + m), xi * yk * ym, 0.5 * (1.0 + yk - ym))
        for (k, yk), (m, ym) in combinations(anions, 2)
        for i, xi in cations
    ]
    corners = tuple((binaries[i + k], xi * yk) for i, xi in cations for k, yk in anions)
    return _Mixture(composition.name, corners, tuple(sides))


def _mixed(mixture: _Mixture, quantity: str, of_binary: Callable[[Binary], float]) -> float:
    """Apply the interpolation law to one quantity of the catalogue."""
    bowings = catalogue().bowings
    total = math.fsum(weight * of_binary(binary) for binary, weight in mixture.corners)
    for pair, weight, x in mixture.sides:
        row = bowings.get(pair, {}).get(quantity)
        if row is not None:
            total -= weight * (row.constant + row.per_x * x)
    return total
