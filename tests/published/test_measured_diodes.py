"""Peaks of measured two-barrier diodes, all figures from memory.

The literature calls agreement of a one-band, coherent model with a measured peak current within a
factor of two to three typical (thicknesses are known to a monolayer, which alone changes the
current by a factor of two); the factor here is `FACTOR`. Measured voltages hold the series
resistance, hence `VOLTAGE_FACTOR`. Valleys are not compared: nothing scatters here.

- GaAs/AlAs, 1.7 nm barriers, 4.5 nm well, 4e4 A/cm2: E. R. Brown et al., Appl. Phys. Lett. 50, 83
  (1987).
- In0.53Ga0.47As/AlAs on InP, 2.4 nm barriers, 4.4 nm well, 2.3e4 A/cm2, near 0.6 V: T. Inata et
  al., Jpn. J. Appl. Phys. 26, L1332 (1987).
- InAs/AlSb, 1.8 nm barriers, 6.4 nm well, 2.8e5 A/cm2: E. R. Brown et al., Appl. Phys. Lett. 58,
  2291 (1991).
"""

import numpy as np
import pytest

from tui.session.model import Conditions, ContactEntry, Growth, LayerEntry, Session
from tui.sweep import SweepRequest, sweep

FACTOR, VOLTAGE_FACTOR = 3.0, 2.0


def diode(contact: str, barrier: str, thickness_nm: tuple[float, ...], substrate: str) -> Session:
    """Spacer, barrier and well thick as given."""
    spacer_nm, barrier_nm, well_nm = thickness_nm
    outer = ContactEntry(material=contact, donors_cm3=1e18)
    spacer = LayerEntry(material=contact, thickness_nm=spacer_nm)
    wall = LayerEntry(material=barrier, thickness_nm=barrier_nm)
    well = LayerEntry(material=contact, thickness_nm=well_nm)
    return Session(
        conditions=Conditions(temperature_K=300.0, field="screened", band="kane"),
        growth=Growth(substrate),
        left=outer,
        layers=(spacer, wall, well, wall, spacer),
        right=outer,
    )


@pytest.mark.parametrize(
    ("session", "to_V", "measured_A_per_cm2", "measured_V"),
    [
        (diode("GaAs", "AlAs", (1.5, 1.7, 4.5), "GaAs"), 0.45, 4e4, None),
        (diode("In0.53Ga0.47As", "AlAs", (1.5, 2.4, 4.4), "InP"), 0.6, 2.3e4, 0.6),
        (diode("InAs", "AlSb", (10.0, 1.8, 6.4), "InAs"), 0.75, 2.8e5, None),
    ],
)
def test_peak(
    session: Session, to_V: float, measured_A_per_cm2: float, measured_V: float | None
) -> None:
    found = sweep(SweepRequest(session, 0.1, to_V, 21))
    assert found.reached
    assert found.main is not None
    peak = found.main.peak
    assert abs(np.log(peak.current_density_A_per_cm2 / measured_A_per_cm2)) < np.log(FACTOR)
    if measured_V is not None:
        assert abs(np.log(peak.bias_V / measured_V)) < np.log(VOLTAGE_FACTOR)
