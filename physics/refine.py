"""From a first mesh and its charge to the mesh that is worked on: few pieces where it is empty."""

from __future__ import annotations

import itertools
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from physics.mesh import (
    CHORD_EV,
    MOST_PIECES,
    MOST_PIECES_PER_NM,
    SLOPE,
    WAVE_STEP_NM,
    Mesh,
    Slab,
    mesh_of_slabs,
    with_middles,
)

FloatArray = NDArray[np.float64]

LEAST_NM3 = 1e-20
"""Charge below which an element is as long as it likes."""


def refined(mesh: Mesh, charge_nm3: FloatArray, limit_nm: FloatArray, *, waves: bool) -> Mesh:
    """Lay the elements anew, as long as the charge allows.

    A piece of length h, half an element, departs from the curved edge by ``h^2 rho / (8 eps)``.

    Parameters
    ----------
    mesh : Mesh
        The first mesh.
    charge_nm3 : ndarray, shape (E,)
        Largest net charge met in each of its elements.
    limit_nm : ndarray, shape (E,)
        What no element there may be longer than; inf for no limit.
    waves : bool
        Whether electrons in the tunnelling region are waves, which bend the edge there too.
    """
    charge = np.maximum(np.abs(charge_nm3), LEAST_NM3)
    longest = 2.0 * np.sqrt(8.0 * mesh.permittivity * CHORD_EV / charge)
    length = _smoothed(mesh, np.minimum(longest, limit_nm))
    in_region = mesh.side == 0
    pieces = 2.0 * float((mesh.step_nm / length).sum())
    most = max(MOST_PIECES, MOST_PIECES_PER_NM * mesh.stack_nm)
    length = length * max(1.0, pieces / most)
    if waves:
        length = np.where(in_region, np.minimum(length, WAVE_STEP_NM), length)
    slabs = [_slab(mesh, group, _divided(mesh, group, length)) for group in _groups(mesh)]
    return replace(mesh_of_slabs(slabs, mesh), waves=waves)


def halved(mesh: Mesh) -> Mesh:
    """Cut every element into two."""
    slabs = [
        _slab(mesh, group, with_middles(mesh.face_nm[group.start : group.stop + 1]))
        for group in _groups(mesh)
    ]
    return mesh_of_slabs(slabs, mesh)


def _smoothed(mesh: Mesh, longest: FloatArray) -> FloatArray:
    """Let the length grow by no more than `SLOPE` per nm, but across what holds no charge."""
    middle = 0.5 * (mesh.face_nm[1:] + mesh.face_nm[:-1])
    charged = np.flatnonzero((mesh.side != 0) | (mesh.donors_nm3 > 0.0))
    length = longest.copy()
    for order in (charged, charged[::-1]):
        for before, here in itertools.pairwise(order):
            distance = abs(middle[here] - middle[before])
            length[here] = min(length[here], length[before] + SLOPE * distance)
    return length


def _groups(mesh: Mesh) -> list[slice]:
    """Find the runs of elements in one layer, on one side, all bent or all flat."""
    size = mesh.layer_index.size
    changes = (np.diff(mesh.layer_index) != 0) | (np.diff(mesh.side) != 0)
    inner = {*(np.flatnonzero(changes) + 1).tolist(), mesh.bent.start, mesh.bent.stop}
    ends = sorted({0, size, *inner})
    return [slice(a, b) for a, b in itertools.pairwise(ends)]


def _divided(mesh: Mesh, group: slice, length: FloatArray) -> FloatArray:
    """Faces of a run whose elements have about the wanted lengths."""
    face = mesh.face_nm[group.start : group.stop + 1]
    total = np.append(0.0, np.cumsum(np.diff(face) / length[group]))
    if not total[-1] > 1.0:
        return np.array([face[0], face[-1]])
    wanted = np.linspace(0.0, total[-1], int(np.ceil(total[-1])) + 1)
    inner = np.interp(wanted[1:-1], total, face)
    return np.concatenate([[face[0]], inner, [face[-1]]])


def _slab(mesh: Mesh, group: slice, face: FloatArray) -> Slab:
    first, last = group.start, group.stop - 1
    return Slab(
        layer=int(mesh.layer_index[first]),
        face=face,
        edge=(float(mesh.edge_eV[first, 0]), float(mesh.edge_eV[last, 2])),
        mass=(float(mesh.mass[first, 0]), float(mesh.mass[last, 2])),
        permittivity=float(mesh.permittivity[first]),
        donors_nm3=float(mesh.donors_nm3[first]),
        ends=(float(face[0]), float(face[-1])),
    )
