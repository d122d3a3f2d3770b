"""The whole stack file, as written."""

from pydantic import Field

from slabsim.stack.file_layers import Entry
from slabsim.stack.file_materials import MaterialTable
from slabsim.stack.file_sweep import SweepTable
from slabsim.stack.quantities import FileTable, Host, HostOrConductor, NewMaterial


class Document(FileTable):
    """A stack and the sweep over it."""

    title: str = Field("", description="One line that says what this is")
    front: Host = Field("vacuum", description="Half-space the wave comes from, a lossless material")
    back: HostOrConductor = Field("vacuum", description='Half-space behind; "perfect conductor" is a metal backing')
    material: dict[NewMaterial, MaterialTable] = Field({}, description="Materials, [material.name]")
    layer: list[Entry] = Field(min_length=1, description="Layers, sheets and groups, front to back: [[layer]]")
    sweep: SweepTable = Field(description="Frequencies, angles and polarizations: [sweep]")
