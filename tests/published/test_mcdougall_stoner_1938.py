"""J. McDougall and E. C. Stoner, Phil. Trans. R. Soc. A 237, 67 (1938).

Their table of F_1/2, from memory.
"""

from __future__ import annotations

import pytest

from physics.occupation import fermi_dirac_half


@pytest.mark.parametrize(
    ("eta", "value"),
    [
        (-4.0, 0.016128),
        (0.0, 0.678094),
        (1.0, 1.396375),
        (2.0, 2.502458),
        (4.0, 5.770726),
        (10.0, 21.344471),
    ],
)
def test_table(eta: float, value: float) -> None:
    assert float(fermi_dirac_half(eta)[0]) == pytest.approx(value, abs=1e-6)
