"""Adaptive quadrature on many panels at once, each with a substitution of its own (no physics).

The rule is the pair of Gauss (7 points) and Kronrod (15 points), A. S. Kronrod, Nodes and Weights
of Quadrature Formulas (1965); figures from R. Piessens et al., QUADPACK (1983), from memory, and
tested by the polynomials that they integrate exactly. The error estimate is QUADPACK's.

A panel integrates over s, from which x = centre + scale * shape(s):

- `EVEN`: shape(s) = s;
- `PEAK`: shape(s) = sinh(s), which makes a line 1 / (1 + (x / scale)^2) as smooth as 1 / cosh(s),
  however narrow, and resolves its wings in decades;
- `ROOT`: shape(s) = s^2, which takes the root at a threshold away.
"""

from __future__ import annotations

from dataclasses import dataclass, fields, replace

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IndexArray = NDArray[np.int64]

EVEN, PEAK, ROOT = 0, 1, 2

_OUTER = (
    (0.991455371120812639206854697526329, 0.022935322010529224963732008058970),
    (0.949107912342758524526189684047851, 0.063092092629978553290700663189204),
    (0.864864423359769072789712788640926, 0.104790010322250183839876322541518),
    (0.741531185599394439863864773280788, 0.140653259715525918745189590510238),
    (0.586087235467691130294144691693013, 0.169004726639267902826583426598550),
    (0.405845151377397166906606412076961, 0.190350578064785409913256402421014),
    (0.207784955007898467600689403773245, 0.204432940075298892414161999234649),
)
_CENTRE_WEIGHT = 0.209482141084727828012999174891714
_GAUSS = (
    0.129484966168869693270611432679082,
    0.279705391489276667901467771423780,
    0.381830050505118944950369775488975,
)
_GAUSS_CENTRE = 0.417959183673469387755102040816327

_half = np.array(_OUTER)
NODE = np.concatenate([-_half[:, 0], [0.0], _half[::-1, 0]])
"""Nodes in (-1, 1), shape (15,)."""
KRONROD = np.concatenate([_half[:, 1], [_CENTRE_WEIGHT], _half[::-1, 1]])
"""Weights of the 15-point rule."""
GAUSS = np.zeros(15)
GAUSS[1::2] = (*_GAUSS, _GAUSS_CENTRE, *_GAUSS[::-1])
"""Weights of the 7-point rule on the same nodes; 0 at those that are not its own."""


@dataclass(frozen=True, eq=False)
class Panels:
    """N panels; every array has shape (N,)."""

    owner: IndexArray
    """Whose integral the panel is part of."""
    group: IndexArray
    """What the panel's part of the integral is booked on."""
    kind: IndexArray
    """`EVEN`, `PEAK` or `ROOT`."""
    centre: FloatArray
    scale: FloatArray
    start: FloatArray
    """First s."""
    stop: FloatArray
    """Last s."""

    @property
    def count(self) -> int:
        """Number of panels."""
        return self.owner.size

    def pick(self, which: NDArray[np.bool_] | IndexArray) -> Panels:
        """Give some of the panels."""
        return Panels(**{field.name: getattr(self, field.name)[which] for field in fields(self)})

    def halved(self) -> Panels:
        """Cut every panel in two."""
        middle = 0.5 * (self.start + self.stop)
        return joined([replace(self, stop=middle), replace(self, start=middle)])

    def nodes(self) -> tuple[FloatArray, FloatArray]:
        """Give the nodes' distances from the centre and the weights' dx, each of shape (N, 15)."""
        half = 0.5 * (self.stop - self.start)[:, None]
        s = 0.5 * (self.start + self.stop)[:, None] + half * NODE
        kind, scale = self.kind[:, None], self.scale[:, None]
        shape = np.where(kind == PEAK, np.sinh(s), np.where(kind == ROOT, s * s, s))
        slope = np.where(kind == PEAK, np.cosh(s), np.where(kind == ROOT, 2.0 * s, 1.0))
        return scale * shape, scale * slope * half


def joined(parts: list[Panels]) -> Panels:
    """Put panels together."""
    names = [field.name for field in fields(Panels)]
    return Panels(**{name: np.concatenate([getattr(p, name) for p in parts]) for name in names})


def estimate(values: FloatArray, dx: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Integrate each panel.

    Parameters
    ----------
    values, dx : ndarray, shape (N, 15)
        The integrand at the nodes, and what `Panels.nodes` gave with them.

    Returns
    -------
    integral, error : ndarray, shape (N,)
        The 15-point rule, and QUADPACK's estimate of its error from the 7-point one.
    """
    weighted = values * dx
    integral = weighted @ KRONROD
    difference = np.abs(integral - weighted @ GAUSS)
    spread = np.abs(weighted - 0.5 * integral[:, None]) @ KRONROD
    known = spread > 0.0
    ratio = np.minimum(1.0, 200.0 * difference / np.where(known, spread, 1.0)) ** 1.5
    return integral, np.where(known, spread * ratio, difference)
