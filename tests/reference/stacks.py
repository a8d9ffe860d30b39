"""Stacks that several tests are tried on, in winze's own terms and in the reference's."""

from __future__ import annotations

from physics.structure import Contact, Layer, Structure
from reference.many_digits import Slab, Stack, biased


def stack(
    layers: list[tuple[float, ...]],
    left: tuple[float, float] = (0.0, 0.067),
    right: tuple[float, float] = (0.0, 0.067),
) -> Structure:
    """Layers as (thickness, edge, mass, to_edge, to_mass), contacts as (edge, mass)."""
    return Structure(Contact(*left), tuple(Layer(*layer) for layer in layers), Contact(*right))


def two_barriers(
    first: float = 2.0, well: float = 5.0, second: float = 2.0, height: float = 0.3
) -> Structure:
    """Two barriers between contacts like the well."""
    return stack([(first, height, 0.092), (well, 0.0, 0.067), (second, height, 0.092)])


def as_reference(structure: Structure, bias: float = 0.0) -> Stack:
    """Say the same structure to the reference (one permittivity, no Fermi energies)."""
    slabs = tuple(
        Slab(
            layer.thickness_nm,
            layer.edge_eV,
            layer.mass,
            layer.to_edge_eV,
            layer.to_mass,
            layer.gap_eV,
            layer.to_gap_eV,
        )
        for layer in structure.layers
    )
    left, right = (
        (side.edge_eV, side.mass) if side.gap_eV is None else (side.edge_eV, side.mass, side.gap_eV)
        for side in (structure.left, structure.right)
    )
    plain = Stack(left, slabs, right)
    return biased(plain, bias) if bias else plain
