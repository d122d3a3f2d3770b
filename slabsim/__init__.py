"""Reflection, transmission and absorption of slabs of thin parallel wires (wire media)."""

__version__ = "0.1.0"
