"""What a solution of Poisson's equation is handed on as: profile, charge and report."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from physics.band import Band, masses_of
from physics.charge import Electrons
from physics.field import Profile, built_in_eV
from physics.mesh import NM3_PER_CM3, Mesh
from physics.newton import SIMPSON, Relaxed, on_elements, on_nodes
from physics.region import faces_nm
from physics.structure import Structure

FloatArray = NDArray[np.float64]

CM2_PER_NM2 = 1e14
"""Sheet density in cm^-2 of one in nm^-2."""


@dataclass(frozen=True)
class ScreeningReport:
    """How well the equation is solved, and for what."""

    converged: bool
    iterations: int
    """Newton steps, the last of which changed nothing that matters."""
    residual: float
    """Largest imbalance of a node over the largest charge of a node."""
    neutrality: float
    """Total charge over the sum of all charges' sizes."""
    end_field_V_per_nm: float
    """Largest field left at the ends of the domain."""
    mesh_error_eV: float
    """What halving all steps would change in the edge, at the nodes or between them; nan where it
    is not known."""
    model: str
    """What was solved, in words."""
    reason: str = ""
    """Why it did not converge; empty where it did."""


@dataclass(frozen=True, eq=False)
class Screened:
    """One solution: P pieces, P + 1 nodes."""

    profile: Profile
    """Begins at a negative position in the left contact and ends in the right one, where the band
    is as good as flat."""
    potential_V: FloatArray
    """At ``profile.position_nm``, 0 far to the left; shape (P + 1,)."""
    electrons_cm3: FloatArray
    """At the nodes, the mean of both sides where it jumps; shape (P + 1,)."""
    donors_cm3: FloatArray
    """Likewise."""
    sheet_charge_left_cm2: float
    """Electrons less donors to the left of the tunnelling region."""
    sheet_charge_right_cm2: float
    """Electrons less donors to its right."""
    well_charge_cm2: float
    """Electrons in it."""
    report: ScreeningReport
    mesh: Mesh
    whole_V: FloatArray
    """Potential at all the mesh's nodes, beyond the profile's ends too; shape (2 E + 1,)."""
    bias_V: float


def screened(
    structure: Structure,
    mesh: Mesh,
    bias_V: float,
    electrons: Electrons,
    relaxed: Relaxed,
    *,
    model: str,
    reason: str,
    mesh_error_eV: float,
    band: Band = "parabolic",
) -> Screened:
    """Put a solution together with the words for its model and for the reason of a failure."""
    count, _ = electrons(on_elements(relaxed.potential_V))
    weight = mesh.step_nm[:, None] * SIMPSON
    held, given = (count * weight).sum(axis=1), mesh.donors_nm3 * mesh.step_nm
    sheet = [float((held - given)[mesh.side == side].sum()) * CM2_PER_NM2 for side in (-1, 1)]
    report = ScreeningReport(
        converged=relaxed.converged,
        iterations=relaxed.steps,
        residual=relaxed.residual,
        neutrality=abs(float((held - given).sum())) / float((held + given).sum()),
        end_field_V_per_nm=max(end_fields_V_per_nm(mesh, relaxed.potential_V)),
        mesh_error_eV=mesh_error_eV,
        model=model,
        reason=reason,
    )
    nodes = slice(2 * mesh.bent.start, 2 * mesh.bent.stop + 1)
    return Screened(
        profile=bent_profile(structure, mesh, bias_V, relaxed.potential_V, band),
        potential_V=relaxed.potential_V[nodes],
        electrons_cm3=_mean(count)[nodes] / NM3_PER_CM3,
        donors_cm3=_mean(np.repeat(mesh.donors_nm3[:, None], 3, axis=1))[nodes] / NM3_PER_CM3,
        sheet_charge_left_cm2=sheet[0],
        sheet_charge_right_cm2=sheet[1],
        well_charge_cm2=float(held[mesh.side == 0].sum()) * CM2_PER_NM2,
        report=report,
        mesh=mesh,
        whole_V=relaxed.potential_V,
        bias_V=bias_V,
    )


def bent_profile(
    structure: Structure,
    mesh: Mesh,
    bias_V: float,
    potential_V: FloatArray,
    band: Band = "parabolic",
) -> Profile:
    """Band edge as linear pieces between the nodes, two to an element."""
    bent = mesh.bent
    edge, mass = (mesh.edge_eV - on_elements(potential_V))[bent], mesh.mass[bent]
    slope = _mass_slopes(structure, mesh, band)[bent]
    left, right = structure.left, structure.right
    return Profile(
        position_nm=mesh.node_nm[2 * bent.start : 2 * bent.stop + 1],
        thickness_nm=np.repeat(0.5 * mesh.step_nm[bent], 2),
        edge_left_eV=edge[:, :2].ravel(),
        edge_right_eV=edge[:, 1:].ravel(),
        mass_left=mass[:, :2].ravel(),
        mass_right=mass[:, 1:].ravel(),
        layer_index=np.repeat(mesh.layer_index[bent], 2),
        contact_edge_eV=(left.edge_eV, right.edge_eV - (bias_V + built_in_eV(structure))),
        contact_mass=(left.mass, right.mass),
        mass_slope_left=slope[:, :2].ravel(),
        mass_slope_right=slope[:, 1:].ravel(),
        contact_mass_slope=masses_of(structure, band).contact_slope,
    )


def _mass_slopes(structure: Structure, mesh: Mesh, band: Band) -> FloatArray:
    """Mass slope at the nodes of each element, shape (E, 3)."""
    masses, faces = masses_of(structure, band), faces_nm(structure)
    # Behind the layers' the contacts' own: the right one's index is N, the left one's -1.
    right, left = masses.contact_slope[1], masses.contact_slope[0]
    at = mesh.layer_index[:, None]
    first, last = (
        np.append(slopes, [right, left])[at] for slopes in (masses.slope_left, masses.slope_right)
    )
    start, stop = np.append(faces[:-1], [0.0, 0.0])[at], np.append(faces[1:], [1.0, 1.0])[at]
    share = np.clip((on_elements(mesh.node_nm) - start) / (stop - start), 0.0, 1.0)
    slope: FloatArray = first * (1.0 - share) + last * share
    return slope


def end_fields_V_per_nm(mesh: Mesh, potential_V: FloatArray) -> tuple[float, float]:
    """Size of the field at the left and at the right end of the domain."""
    ends = (potential_V[:3], potential_V[-1:-4:-1])
    steps = (mesh.step_nm[0], mesh.step_nm[-1])
    left, right = (
        abs(float(4.0 * (v[1] - v[0]) - (v[2] - v[0])) / float(step))
        for v, step in zip(ends, steps, strict=True)
    )
    return left, right


def _mean(element: FloatArray) -> FloatArray:
    """Values at the nodes from those in the elements, the mean of both sides of a face."""
    return on_nodes(element) / on_nodes(np.ones_like(element))
