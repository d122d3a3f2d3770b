"""What can go wrong.

    SlabsimError                 everything slabsim raises on purpose
    |-- InputError               an argument of a Python call is off
    |-- UnitError                a text is no quantity of the expected dimension
    |-- MaterialError            a material cannot give a value (outside its table, gain)
    |-- StackError               a stack file has one or more faults; `.faults` lists them
    |-- MapError                 a map file cannot be read, written or continued
    `-- SweepInterrupted         a sweep was stopped; its finished blocks are safe

Each message says where, what stands there, what is allowed and what to do.
The command line prints the message and exits with code 1.
"""

from dataclasses import dataclass


class SlabsimError(Exception):
    """Base of all errors that slabsim raises on purpose."""


class InputError(SlabsimError):
    """An argument of a Python call is off."""


class UnitError(SlabsimError):
    """A text is no quantity of the expected dimension."""


class MaterialError(SlabsimError):
    """A material cannot give a value: outside its table, or it would amplify."""


@dataclass(frozen=True)
class Fault:
    """One fault of a stack file.

    Parameters
    ----------
    where : str
        Place in the file, as a key path: ``layer 2 "wire slab": wires.radius``.
    what : str
        What stands there, what is allowed, and the cure.
    """

    where: str
    what: str

    def __str__(self) -> str:
        return f"{self.where}: {self.what}" if self.where else self.what


class StackError(SlabsimError):
    """A stack file has one or more faults, all of them in `faults`."""

    def __init__(self, file: str, faults: list[Fault]) -> None:
        self.file = file
        self.faults = tuple(faults)
        super().__init__("\n".join(f"{file}: {fault}" for fault in faults))


class MapError(SlabsimError):
    """A map file cannot be read, written or continued."""


class SweepInterrupted(SlabsimError):
    """A sweep was stopped by the user; the blocks finished so far are in the map."""
