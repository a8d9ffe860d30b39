"""Layers that take on the substrate's lattice: strain, its shifts of the band edges, its limit.

**Strain.** Growth is along (001) and no layer has relaxed: all share the substrate's lattice
constant in the plane. A layer stretched in the plane shrinks along growth so far that no force is
left there::

    e_par = a_substrate / a_layer - 1        e_perp = -2 (c12 / c11) e_par

**Edges.** With the trace t = 2 e_par + e_perp, after C. G. Van de Walle, Phys. Rev. B 39, 1871
(1989), in the signs of I. Vurgaftman, J. R. Meyer and L. R. Ram-Mohan, J. Appl. Phys. 89, 5815
(2001), both from memory::

    conduction edge at Gamma   + a_c t
    heavy hole                 - a_v t - Q         Q = b (e_perp - e_par)
    light hole                 - a_v t + Q

a_c and a_v are negative in every compound of the catalogue: compression (t < 0) raises the
conduction edge, lowers the mean valence edge, and widens the gap by (a_c + a_v) t before the two
holes split. Van de Walle's own a_v has the other sign. As b < 0, compression leaves the heavy hole
uppermost, tension the light hole.

**Where it is rough.** Elasticity is linear and the strain is taken at the temperature asked for.
The light hole's coupling to the split-off band is left out: it moves the light hole by about 2 Q^2
/ Delta, some 0.01 eV at 1 % of mismatch (0.03 eV in phosphides), and so the gap under tension; the
gap under compression ends at the heavy hole, which has no such coupling. The masses, and the edges
at X and L, stay those of the unstrained crystal.

**Critical thickness.** J. W. Matthews and A. E. Blakeslee, J. Cryst. Growth 27, 118 (1974), from
memory: a threading dislocation is driven sideways by the strain's force, 2 G (1 + nu) / (1 - nu) b
h |e| cos(lambda), and held by the tension of each misfit segment that it leaves behind, G b^2 (1 -
nu cos^2(alpha)) (ln(h / b) + 1) / (4 pi (1 - nu)). The two are equal at::

    h = b (1 - nu cos^2(alpha)) / (k pi |e| (1 + nu) cos(lambda)) (ln(h / b) + 1)

A layer with a free surface gets one segment (single kink), k = 8. A buried layer gets one at each
face (double kink), twice the tension: k = 4, and two to three times the thickness up to 2 % of
mismatch. (In the form with cos(lambda) = 1/2 put in, these are the factors 4 and 2 of I. J. Fritz
et al., Appl. Phys. Lett. 46, 967 (1985), from memory.) The dislocations are of the 60-degree kind,
b = a / sqrt(2) and cos(alpha) = cos(lambda) = 1/2. It is a limit of equilibrium: grown cold, a
layer may stay strained to a few times the thickness.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Literal

from physics.errors import MaterialError
from physics.materials import Elastic, Material

COS_ALPHA = 0.5
COS_LAMBDA = 0.5
SINGLE_KINK_FACTOR = 8.0
MOST_STEPS = 100
"""Newton's steps to a critical thickness; some 6 are used, 30 where two roots all but meet."""
STEP_TOLERANCE = 1e-14

Kinks = Literal[1, 2]
"""Misfit segments that a dislocation leaves: 1 under a free surface, 2 in a buried layer."""


@dataclass(frozen=True)
class Strain:
    """A material on a substrate; strains are relative, positive where stretched."""

    in_plane: float
    perpendicular: float
    """Along growth."""
    edge_shift_eV: float
    """Shift of the conduction edge at Gamma."""
    heavy_hole_shift_eV: float
    light_hole_shift_eV: float
    gap_eV: float
    """From the uppermost of heavy and light hole to the conduction edge at Gamma."""
    monolayer_nm: float
    """One strained monolayer along growth, at the temperature at which monolayers are counted."""

    @property
    def trace(self) -> float:
        """Relative change of the volume."""
        return 2.0 * self.in_plane + self.perpendicular


def strain_on(layer: Material, substrate: Material) -> Strain:
    """Strain a material to a substrate's lattice.

    Parameters
    ----------
    layer, substrate : Material
        Of the catalogue, both at one temperature, on any scale of energy.

    Raises
    ------
    MaterialError
        A lattice constant, a gap or an elastic constant is not known, or no gap is left.
    """
    own = layer.elastic
    if own is None:
        raise _unknown(layer)
    unstrained_gap_eV = _known(layer, layer.gap_eV)
    in_plane = _known(substrate, substrate.lattice_nm) / _known(layer, layer.lattice_nm) - 1.0
    ratio = -2.0 * own.c12_GPa / own.c11_GPa
    perpendicular = ratio * in_plane
    trace = 2.0 * in_plane + perpendicular
    split = own.b_eV * (perpendicular - in_plane)
    edge, mean = own.a_c_eV * trace, -own.a_v_eV * trace
    gap = unstrained_gap_eV + edge - mean - abs(split)
    if gap <= 0.0:
        raise MaterialError(
            f"material {layer.name!r}: its gap, strained to {substrate.name}, is {gap:.3g} eV; "
            "a conduction band needs a gap above 0, so name a substrate closer to it"
        )
    counted = _known(layer, layer.monolayer_nm)
    counted_strain = _known(substrate, substrate.monolayer_nm) / counted - 1.0
    return Strain(
        in_plane=in_plane,
        perpendicular=perpendicular,
        edge_shift_eV=edge,
        heavy_hole_shift_eV=mean - split,
        light_hole_shift_eV=mean + split,
        gap_eV=gap,
        monolayer_nm=counted * (1.0 + ratio * counted_strain),
    )


def strained(layer: Material, strain: Strain) -> Material:
    """Give a material with the edge, the gap and the monolayer that it has under a strain.

    Its lattice constant, mass and edges at X and L stay those of the unstrained crystal.
    """
    return replace(
        layer,
        edge_eV=layer.edge_eV + strain.edge_shift_eV,
        gap_eV=strain.gap_eV,
        monolayer_nm=strain.monolayer_nm,
    )


def poisson_ratio(elastic: Elastic) -> float:
    """Poisson's ratio along the cube's axes, c12 / (c11 + c12)."""
    return elastic.c12_GPa / (elastic.c11_GPa + elastic.c12_GPa)


def critical_thickness_nm(
    in_plane: float, lattice_nm: float, poisson: float, kinks: Kinks = 2
) -> float | None:
    """Thickness from which misfit dislocations form in equilibrium (Matthews and Blakeslee).

    Parameters
    ----------
    in_plane : float
        Strain in the plane, of either sign.
    lattice_nm : float
        Lattice constant that gives the Burgers vector.
    poisson : float
        Poisson's ratio.
    kinks : int
        2 for a buried layer, 1 for one with a free surface.

    Returns
    -------
    float or None
        In nm, to rounding, always at least the Burgers vector; infinite without strain. None where
        the law has no solution: no layer as thick as the Burgers vector (1.4 monolayers) holds.
    """
    if in_plane == 0.0:
        return math.inf
    burgers_nm = lattice_nm / math.sqrt(2.0)
    tension = kinks * (1.0 - poisson * COS_ALPHA**2)
    force = SINGLE_KINK_FACTOR * math.pi * abs(in_plane) * (1.0 + poisson) * COS_LAMBDA
    thickness = _balance(tension / force)
    return None if thickness is None else burgers_nm * thickness


def _balance(scale: float) -> float | None:
    """Solve u = scale (ln u + 1) for its larger root.

    u - scale (ln u + 1) is convex, and at u = scale it has its least value, -scale ln(scale):
    there is a root from scale = 1 on. Newton's steps from above never pass it. They start at
    2 scale ln(2 scale), which lies above, as ln u <= ln(2 scale) + u / (2 scale) - 1.
    """
    if scale < 1.0:
        return None
    u = 2.0 * scale * math.log(2.0 * scale)
    for _ in range(MOST_STEPS):
        if u <= scale:  # rounding alone leads here: the two roots meet
            return scale
        step = (u - scale * (math.log(u) + 1.0)) / (1.0 - scale / u)
        u -= step
        if abs(step) <= STEP_TOLERANCE * u:
            break
    return u


def _known(of: Material, value: float | None) -> float:
    if value is None:
        raise _unknown(of)
    return value


def _unknown(of: Material) -> MaterialError:
    return MaterialError(f"material {of.name!r}: its strain is not known; take one by formula")
