"""What each quantity may be; the one list that described values and session texts are held to."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Range:
    """What a quantity may be."""

    low: float
    high: float
    allowed: str
    """The range in words."""
    open_below: bool = False
    """Whether the lower end itself is left out."""

    def holds(self, value: float) -> bool:
        """Whether a value lies in the range; nan does not."""
        return (self.low < value if self.open_below else self.low <= value) and value <= self.high


THICKNESS_NM = Range(1e-6, 1e5, "a thickness lies between 1e-6 and 1e5 nm")
"""A thinner layer drowns in the rounding of a double: a level of it would be a guess."""
EDGE_EV = Range(-100.0, 100.0, "a band edge lies between -100 and 100 eV")
MASS = Range(1e-4, 100.0, "a mass lies between 1e-4 and 100 m0")
FERMI_EV = Range(-100.0, 100.0, "a Fermi energy lies between -100 and 100 eV")
DONORS_CM3 = Range(0.0, 1e22, "donors lie between 0 and 1e22 cm^-3")
CONTACT_DONORS_CM3 = Range(
    0.0, 1e22, "a contact's donors are above 0 and at most 1e22 cm^-3", open_below=True
)
PERMITTIVITY = Range(1.0, 1e4, "a relative permittivity lies between 1 and 1e4")
GAP_EV = Range(1e-3, 20.0, "a gap lies between 1e-3 and 20 eV")
LATTICE_NM = Range(0.1, 10.0, "a lattice constant lies between 0.1 and 10 nm")
MONOLAYER_NM = Range(0.05, 5.0, "a monolayer is between 0.05 and 5 nm thick")
TEMPERATURE_K = Range(0.01, 2000.0, "a temperature lies between 0.01 and 2000 K")
BIAS_V = Range(-50.0, 50.0, "a bias lies between -50 and 50 V")
MESA_UM2 = Range(0.0, 1e8, "a mesa's area is above 0 and at most 1e8 um^2", open_below=True)
SERIES_OHM = Range(0.0, 1e9, "a series resistance lies between 0 and 1e9 ohm")
PARALLEL_FF = Range(0.0, 1e9, "a parallel capacitance lies between 0 and 1e9 fF")
DEPHASING_EV = Range(0.0, 1.0, "a dephasing width lies between 0 and 1 eV")
SCATTERING_TIME_S = Range(1e-15, 1.0, "a scattering time lies between 1e-15 and 1 s")
MOBILITY_CM2_VS = Range(1.0, 1e9, "a mobility lies between 1 and 1e9 cm^2/Vs")
