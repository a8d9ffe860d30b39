"""Transfer matrices at 50 digits: exponentials in flat layers, Airy functions in tilted ones.

Written for the tests alone and sharing no code with ``physics``. A flat layer uses cosh and sinh; a
linear edge with one mass the Airy functions (NIST Digital Library of Mathematical Functions, 9.2),
with Wronskian 1/pi (9.2.7). With linear mass there is no such closed form: the pair
psi' = (m/c) f, f' = (V - E) psi is summed as its Taylor series on short steps. With a gap the mass
is m (1 + (E - V) / gap), where m and m / gap go linearly from face to face.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import mpmath as mp

DIGITS = 50
mp.mp.dps = DIGITS


@dataclass(frozen=True)
class Slab:
    """One layer: thickness in nm, edge in eV and mass in m0 at both faces."""

    thickness: float
    edge: float
    mass: float
    to_edge: float | None = None
    to_mass: float | None = None
    gap: float | None = None
    to_gap: float | None = None

    def mass_slopes(self) -> tuple[mp.mpf, mp.mpf]:
        """Growth of the mass with E - V at both faces; 0 without a gap."""
        if self.gap is None:
            return mp.mpf(0), mp.mpf(0)
        to_mass = self.mass if self.to_mass is None else self.to_mass
        to_gap = self.gap if self.to_gap is None else self.to_gap
        return mp.mpf(self.mass) / mp.mpf(self.gap), mp.mpf(to_mass) / mp.mpf(to_gap)


@dataclass(frozen=True)
class Stack:
    """Slabs between contacts given as (edge, mass) or (edge, mass, gap), the bias in the edges."""

    left: tuple[float, ...]
    slabs: tuple[Slab, ...]
    right: tuple[float, ...]


def constant() -> mp.mpf:
    """hbar^2 / 2 m0 in eV nm^2 from the CODATA 2022 values."""
    h, e, m = mp.mpf("6.62607015e-34"), mp.mpf("1.602176634e-19"), mp.mpf("9.1093837139e-31")
    return (h / (2 * mp.pi)) ** 2 / (2 * m) / e * mp.mpf(10) ** 18


def contact_mass(contact: tuple[float, ...], energy: mp.mpc) -> mp.mpc:
    """Mass of a contact at an energy."""
    mass = mp.mpf(contact[1])
    gap = contact[2:]
    return mass * (1 + (energy - mp.mpf(contact[0])) / mp.mpf(gap[0])) if gap else mass


def biased(stack: Stack, drop: float) -> Stack:
    """Let a drop fall linearly across the slabs (one permittivity)."""
    length = mp.fsum(mp.mpf(slab.thickness) for slab in stack.slabs)
    x, slabs = mp.mpf(0), []
    for slab in stack.slabs:
        end = x + mp.mpf(slab.thickness)
        to_edge = slab.edge if slab.to_edge is None else slab.to_edge
        slabs.append(
            Slab(
                slab.thickness,
                mp.mpf(slab.edge) - mp.mpf(drop) * x / length,
                slab.mass,
                mp.mpf(to_edge) - mp.mpf(drop) * end / length,
                slab.to_mass,
                slab.gap,
                slab.to_gap,
            )
        )
        x = end
    right = (mp.mpf(stack.right[0]) - mp.mpf(drop), *stack.right[1:])
    return Stack(stack.left, tuple(slabs), right)


def slab_matrix(slab: Slab, energy: mp.mpc) -> mp.matrix:
    """Matrix that carries (psi, c psi'/m) from the slab's left to its right face."""
    d, v, m = mp.mpf(slab.thickness), mp.mpf(slab.edge), mp.mpf(slab.mass)
    to_v = v if slab.to_edge is None else mp.mpf(slab.to_edge)
    to_m = m if slab.to_mass is None else mp.mpf(slab.to_mass)
    b, to_b = slab.mass_slopes()
    if to_v == v and to_m == m and to_b == b:
        return _flat(d, v, m + b * (energy - v), energy)
    if to_m != m or b != 0:
        return _taylor(d, (v, to_v), (m, to_m), (b, to_b), energy)
    return _airy(d, v, to_v, m, energy)


def _flat(d: mp.mpf, v: mp.mpf, m: mp.mpf, energy: mp.mpc) -> mp.matrix:
    c = constant()
    q = mp.sqrt(m * (v - energy) / c)
    if q == 0:
        return mp.matrix([[1, m * d / c], [0, 1]])
    return mp.matrix(
        [
            [mp.cosh(q * d), m / (c * q) * mp.sinh(q * d)],
            [c * q / m * mp.sinh(q * d), mp.cosh(q * d)],
        ]
    )


def _airy(d: mp.mpf, v: mp.mpf, to_v: mp.mpf, m: mp.mpf, energy: mp.mpc) -> mp.matrix:
    c = constant()
    force = (to_v - v) / d
    beta = mp.sign(force) * mp.cbrt(abs(force) * m / c)
    start, stop = beta * (v - energy) / force, beta * (to_v - energy) / force
    g = c * beta / m

    def fundamental(z: mp.mpc) -> mp.matrix:
        return mp.matrix(
            [
                [mp.airyai(z), mp.airybi(z)],
                [g * mp.airyai(z, derivative=1), g * mp.airybi(z, derivative=1)],
            ]
        )

    a = fundamental(start)
    inverse = mp.pi / g * mp.matrix([[a[1, 1], -a[0, 1]], [-a[1, 0], a[0, 0]]])
    return fundamental(stop) * inverse


def _taylor(
    d: mp.mpf,
    edge: tuple[mp.mpf, mp.mpf],
    mass: tuple[mp.mpf, mp.mpf],
    slope: tuple[mp.mpf, mp.mpf],
    energy: mp.mpc,
) -> mp.matrix:
    c, steps = constant(), 1 + int(d)
    (v, to_v), (m, to_m), (b, to_b) = edge, mass, slope
    total = mp.eye(2)
    for n in range(steps):
        h = d / steps
        v0, v1 = v + (to_v - v) * n / steps - energy, (to_v - v) / steps
        m0, m1 = m + (to_m - m) * n / steps, (to_m - m) / steps
        b0, b1 = b + (to_b - b) * n / steps, (to_b - b) / steps
        at_energy = m0 - b0 * v0, m1 - b0 * v1 - b1 * v0, -b1 * v1
        columns = []
        for psi, flux in ((mp.mpf(1), mp.mpf(0)), (mp.mpf(0), mp.mpf(1))):
            p, f = [mp.mpc(psi)], [mp.mpc(flux)]
            for k in range(60):
                past = zip(at_energy, (f[k], *reversed(f[:k])), strict=False)
                slower = p[k - 1] if k else 0
                p.append(h / c * mp.fsum(factor * value for factor, value in past) / (k + 1))
                f.append(h * (v0 * p[k] + v1 * slower) / (k + 1))
            columns.append((mp.fsum(p), mp.fsum(f)))
        total = mp.matrix([[columns[0][0], columns[1][0]], [columns[0][1], columns[1][1]]]) * total
    return total


def whole_matrix(stack: Stack, energy: mp.mpc) -> mp.matrix:
    """Carry (psi, c psi'/m) from the left contact's face to the right contact's face."""
    total = mp.eye(2)
    for slab in stack.slabs:
        total = slab_matrix(slab, energy) * total
    return total


def transmission(stack: Stack, energy: float) -> tuple[mp.mpf, mp.mpf]:
    """T and R of a wave from the left; both contacts open."""
    c, e = constant(), mp.mpf(energy)
    q = [
        mp.sqrt(c / contact_mass(contact, e) * (e - mp.mpf(contact[0])))
        for contact in (stack.left, stack.right)
    ]
    big = whole_matrix(stack, e)
    # (1 + r, i q0 (1 - r)) at the left face becomes (t, i q1 t) at the right one.
    a, b, cc, d = big[0, 0], big[0, 1], big[1, 0], big[1, 1]
    i = mp.mpc(0, 1)
    minus = a - i * q[0] * b, cc - i * q[0] * d
    plus = a + i * q[0] * b, cc + i * q[0] * d
    r = -(plus[1] - i * q[1] * plus[0]) / (minus[1] - i * q[1] * minus[0])
    t = plus[0] + r * minus[0]
    return q[1] / q[0] * abs(t) ** 2, abs(r) ** 2


def pole(stack: Stack, guess: complex) -> mp.mpc:
    """Complex energy at which a wave exists that only leaves, nearest to a guess."""
    condition = only_leaves(stack, guess.real)
    start = mp.mpc(guess)
    near = (start, start * (1 + mp.mpf(10) ** -9))
    return mp.findroot(condition, near, tol=mp.mpf(10) ** (12 - mp.mp.dps))


def only_leaves(stack: Stack, energy: float) -> Callable[[mp.mpc], mp.mpc]:
    """Give the function that vanishes at the poles on the sheet of a real energy."""
    c = constant()
    open_left, open_right = (energy > mp.mpf(v) for v, *_ in (stack.left, stack.right))

    def outward(contact: tuple[float, ...], is_open: bool, energy: mp.mpc) -> mp.mpc:
        above = (energy - mp.mpf(contact[0])) * c / contact_mass(contact, energy)
        return mp.mpc(0, 1) * mp.sqrt(above) if is_open else -mp.sqrt(-above)

    def condition(energy: mp.mpc) -> mp.mpc:
        big = whole_matrix(stack, energy)
        left = outward(stack.left, open_left, energy)
        right = outward(stack.right, open_right, energy)
        psi, flux = big[0, 0] - left * big[0, 1], big[1, 0] - left * big[1, 1]
        return flux - right * psi

    return condition
