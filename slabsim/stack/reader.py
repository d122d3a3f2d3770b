"""A stack file read, checked as a whole, and turned into a `Stack`.

Every part is checked even if another one has faults, as far as its own data are good, so that one run
reports all there is to correct.
"""

import tomllib
from collections.abc import Mapping
from dataclasses import replace
from functools import cached_property
from pathlib import Path as FilePath
from typing import Any

import numpy as np
from pydantic import TypeAdapter, ValidationError

from slabsim.errors import Fault, MaterialError, StackError
from slabsim.materials.material import VACUUM, Material
from slabsim.stack.building import build_material, build_stack
from slabsim.stack.complaints import Complaints
from slabsim.stack.document import Document
from slabsim.stack.file_materials import MaterialTable
from slabsim.stack.file_sweep import AzimuthAxis, SpectrumAxis, angles_deg, frequencies, spectral_unit
from slabsim.stack.file_wires import GridData, MeshTable
from slabsim.stack.joints import resolve_ends
from slabsim.stack.lines import key_lines
from slabsim.stack.physical import front_fault, isotropy_fault, lattice_fault, material_fault, metal_fault
from slabsim.stack.places import has_plates, uses, wire_tables, written_out
from slabsim.stack.quantities import CONDUCTOR_NAME, VACUUM_NAME
from slabsim.stack.sample import Stack

_SPECTRUM: TypeAdapter[Any] = TypeAdapter(SpectrumAxis)
_AZIMUTH: TypeAdapter[Any] = TypeAdapter(AzimuthAxis)
_ISOTROPIC = {
    "front": "the front half-space",
    "back": "the back half-space",
    "filling": "the filling of plates",
}


def read_stack(path: FilePath | str) -> Stack:
    """Stack that a TOML file describes.

    Parameters
    ----------
    path : path or str
        The file; material tables are looked for beside it.

    Returns
    -------
    Stack

    Raises
    ------
    StackError
        With every fault of the file: where, what stands there, what is allowed.
    """
    path = FilePath(path)
    try:
        text = read_utf8(path)
    except MaterialError as error:
        raise StackError(path.name, [Fault("", str(error))]) from None
    return parse_stack(text, path.parent, path.name)


def parse_stack(
    text: str,
    folder: FilePath | str = ".",
    file_name: str = "stack.toml",
    tables: Mapping[str, str] | None = None,
) -> Stack:
    """Stack that a TOML text describes.

    Parameters
    ----------
    text : str
        What a stack file contains.
    folder : path or str
        Where material tables are looked for.
    file_name : str
        Name for messages.
    tables : mapping of str to str, optional
        Texts of the material tables by name as written in `text`; nothing is read from disk then.

    Returns
    -------
    Stack

    Raises
    ------
    StackError
        With every fault of the text.
    """
    try:
        raw = _load(text)
        return _Reading(raw, text, FilePath(folder), tables).stack(file_name)
    except _NotTomlError as error:
        raise StackError(file_name, [Fault("", str(error))]) from None
    except RecursionError:
        raise StackError(file_name, [Fault("", "tables, lists or groups are nested too deeply")]) from None


class _NotTomlError(Exception):
    """Says where the text stops being TOML."""


def _load(text: str) -> dict[str, Any]:
    try:
        return tomllib.loads(text)
    except ValueError as error:  # the TOML reader's own, and Python's for integers of thousands of digits
        message = f'not valid TOML: {error}; a value with a unit is text in quotes, such as "2.5 mm"'
        raise _NotTomlError(message) from None


def read_utf8(path: FilePath) -> str:
    """Text of a file; MaterialError says why it cannot be read."""
    try:
        return path.read_text(encoding="utf-8-sig")
    except FileNotFoundError:
        raise MaterialError(f"there is no file {path}") from None
    except IsADirectoryError:
        raise MaterialError(f"{path} is a folder; name a file in it") from None
    except UnicodeDecodeError as error:
        raise MaterialError(f"{path} is no UTF-8 text (byte {error.start}); save it as UTF-8") from None
    except (OSError, ValueError) as error:
        raise MaterialError(f"{path} cannot be read: {error}") from None


class _Reading:
    """One text on its way to a stack; `complaints` collects the faults met."""

    def __init__(self, raw: dict[str, Any], text: str, folder: FilePath, tables: Mapping[str, str] | None) -> None:
        self.raw = raw
        self.text = text
        self.folder = folder
        self.given_tables = tables
        self.tables: dict[str, str] = {}
        self.complaints = Complaints(raw, key_lines(text))

    def stack(self, file_name: str) -> Stack:
        document = self._document()
        materials = self._materials()
        usable = self._usable(materials)
        places = written_out(self.raw, self.complaints)
        ends = resolve_ends(places, self.raw.get("back") == CONDUCTOR_NAME, self.complaints)
        self._check_wires(usable)
        self._check_isotropy(materials)
        self._check_azimuths()
        faults = self.complaints.faults
        if document is None or faults:
            raise StackError(file_name, faults)
        stack = build_stack(document, materials, ends)
        return replace(stack, text=self.text, file_name=file_name, tables=self.tables)

    def _document(self) -> Document | None:
        context = {"materials": list(self._material_tables())}
        try:
            return Document.model_validate(self.raw, context=context)
        except ValidationError as error:
            self.complaints.add_all(error)
            return None

    def _material_tables(self) -> dict[str, Any]:
        tables = self.raw.get("material")
        return tables if isinstance(tables, dict) else {}

    def _materials(self) -> dict[str, Material]:
        """Materials whose own table is good, by name, vacuum included."""
        materials = {VACUUM_NAME: VACUUM}
        for name, raw in self._material_tables().items():
            try:
                table = MaterialTable.model_validate(raw)
                materials[name] = build_material(name, table, self._table_text)
            except ValidationError:
                continue  # reported with the whole document
            except MaterialError as error:
                self.complaints.add(("material", name, "table"), str(error))
        return materials

    def _table_text(self, name: str) -> str:
        if name not in self.tables:
            self.tables[name] = self._fetch_table(name)
        return self.tables[name]

    def _fetch_table(self, name: str) -> str:
        if self.given_tables is None:
            return read_utf8(self.folder / name)
        if name in self.given_tables:
            return self.given_tables[name]
        raise MaterialError(f'the table "{name}" is not among those given: {", ".join(self.given_tables) or "none"}')

    def _usable(self, materials: dict[str, Material]) -> dict[str, Material]:
        """Those of the materials that hold over the whole sweep; all, if the spectrum has a fault."""
        spectrum = self._spectrum
        if spectrum is None:
            return materials
        used = {use.name for use in uses(self.raw)} & materials.keys()
        faults = {name: material_fault(materials[name], *spectrum) for name in used}
        for name, fault in faults.items():
            self.complaints.add_if(("material", name), fault)
        front = self.raw.get("front", VACUUM_NAME)
        if isinstance(front, str) and front in used and faults[front] is None:
            self.complaints.add_if(("front",), front_fault(materials[front], *spectrum))
        return {name: material for name, material in materials.items() if faults.get(name) is None}

    @cached_property
    def _spectrum(self) -> tuple[np.ndarray, str] | None:
        """Frequencies and their unit, if the file gives them without fault."""
        sweep = self.raw.get("sweep")
        try:
            axis = _SPECTRUM.validate_python(sweep["spectrum"] if isinstance(sweep, dict) else None)
        except (KeyError, ValidationError):
            return None
        return frequencies(axis), spectral_unit(axis)

    def _check_wires(self, materials: dict[str, Material]) -> None:
        hosts = {use.path[:-1]: materials.get(use.name) for use in uses(self.raw) if use.role == "host"}
        for path, layer, wires in wire_tables(self.raw):
            host = None if layer is None else hosts.get(layer)
            if layer is not None and host is None:
                continue
            if host is not None and not isinstance(wires, GridData):
                self.complaints.add_if((*path, "plasma"), lattice_fault(wires, host))
            if host is not None and isinstance(wires, MeshTable):
                self.complaints.add_if((*path[:-1], "material"), isotropy_fault(host, "the host of a mesh"))
            metal = materials.get(wires.metal)
            if metal is not None and self._spectrum is not None:
                self.complaints.add_if((*path, "metal"), metal_fault(metal, host, *self._spectrum))

    def _check_isotropy(self, materials: dict[str, Material]) -> None:
        for use in uses(self.raw):
            if use.role in _ISOTROPIC and use.name in materials:
                self.complaints.add_if(use.path, isotropy_fault(materials[use.name], _ISOTROPIC[use.role]))

    def _check_azimuths(self) -> None:
        """Plates are solved in two planes of incidence only."""
        sweep = self.raw.get("sweep")
        if not has_plates(self.raw) or not isinstance(sweep, dict) or "azimuth" not in sweep:
            return
        try:
            azimuths = angles_deg(_AZIMUTH.validate_python(sweep["azimuth"]))
        except ValidationError:
            return
        slanted = azimuths[azimuths % 90.0 != 0.0]
        if slanted.size:
            self.complaints.add(
                ("sweep", "azimuth"),
                f"{slanted[0]:g} deg with plates in the stack: the reflection of their edge is known for planes of "
                "incidence along and across the plates; every azimuth must be a multiple of 90 deg",
            )
