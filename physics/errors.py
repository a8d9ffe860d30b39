"""What can go wrong in the physics.

::

    PhysicsError
    ├── StructureError      a layer, a contact or a stack that cannot be computed
    ├── MaterialError       a formula or a composition that the catalogue does not carry
    ├── EnergyError         no state of the asked kind at this energy, or an empty window
    └── ConvergenceError    a stated accuracy was not reached
"""

from __future__ import annotations


class PhysicsError(Exception):
    """Base of every error that ``physics`` raises on purpose."""


class StructureError(PhysicsError):
    """A layer, contact or stack that cannot be computed.

    Parameters
    ----------
    where : str
        The part at fault: ``"left"``, ``"right"``, ``"layer 3"``, ``"stack"``.
    key : str
        The field at fault, unit included, as in ``"thickness_nm"``.
    found : object
        The offending value.
    allowed : str
        What would be accepted.
    """

    def __init__(self, where: str, key: str, found: object, allowed: str) -> None:
        self.where = where
        self.key = key
        self.found = found
        self.allowed = allowed
        super().__init__(f"{where}: {key} is {found!r}; {allowed}")


class MaterialError(PhysicsError):
    """A formula that cannot be read, or a composition outside the catalogue."""


class EnergyError(PhysicsError):
    """No state of the asked kind at this energy, or an empty energy window."""


class ConvergenceError(PhysicsError):
    """A computation stopped short of its stated accuracy."""
