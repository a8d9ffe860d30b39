"""What is said of a current curve beside its numbers."""

from __future__ import annotations

from physics.screening import ScreeningReport
from physics.structure import Structure

UNLIKE_MASSES = 0.05
"""Difference of the contacts' masses from which the choice between them is said."""


def said_of_screening(reports: tuple[ScreeningReport, ...]) -> list[str]:
    """Say how Poisson's equation was solved at all biases; nothing where the field is uniform."""
    if not reports:
        return []
    failed = [report for report in reports if not report.converged]
    if failed:
        text = (
            f"screening: {len(failed)} of {len(reports)} fields did not converge, their currents "
            f"are those of the last step: {failed[0].reason}"
        )
        return [text]
    residual = max(report.residual for report in reports)
    neutrality = max(report.neutrality for report in reports)
    off = max(report.mesh_error_eV for report in reports)
    text = (
        f"screening: {reports[0].model}; at all {len(reports)} biases residual up to "
        f"{residual:.0e}, total charge up to {neutrality:.0e} of all charges, edge good to "
        f"{1e3 * off:.2g} meV"
    )
    return [text]


def said_of_masses(structure: Structure) -> list[str]:
    """Say whose mass is taken in the plane, where the contacts' differ."""
    left, right = structure.left.mass, structure.right.mass
    if abs(right / left - 1.0) < UNLIKE_MASSES:
        return []
    text = (
        f"mass: in the plane it is the left contact's, {left:.4g}, for either sign of the bias; "
        f"the right one's is {right:.4g}, and what it sends is off by up to their ratio"
    )
    return [text]
