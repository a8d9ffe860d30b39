"""Constants of nature, CODATA 2022, in the units of winze (eV, nm, s, K, m0).

The elementary charge, the Planck constant and the Boltzmann constant are exact by the definition
of the SI; the electron mass and the electric constant are the adjusted values of CODATA 2022
(P. J. Mohr et al., Rev. Mod. Phys. 97, 025002 (2025)). They are written out here because importing
``scipy.constants`` costs more start-up time than a whole answer; a test holds them against it.
"""

from __future__ import annotations

import math
from typing import Final

ELEMENTARY_CHARGE_C: Final = 1.602176634e-19
PLANCK_J_S: Final = 6.62607015e-34
BOLTZMANN_J_PER_K: Final = 1.380649e-23
ELECTRON_MASS_KG: Final = 9.1093837139e-31
ELECTRIC_CONSTANT_F_PER_M: Final = 8.8541878188e-12

HBAR_J_S: Final = PLANCK_J_S / (2.0 * math.pi)
HBAR_EV_S: Final = HBAR_J_S / ELEMENTARY_CHARGE_C
BOLTZMANN_EV_PER_K: Final = BOLTZMANN_J_PER_K / ELEMENTARY_CHARGE_C

HBAR2_OVER_2M0_EV_NM2: Final = HBAR_J_S**2 / (2.0 * ELECTRON_MASS_KG) / ELEMENTARY_CHARGE_C * 1e18
"""hbar^2 / 2 m0, the constant of the one-band Schroedinger equation, in eV nm^2."""
