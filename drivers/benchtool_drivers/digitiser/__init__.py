"""Digitising instruments: one way to read a record in any dialect."""

from benchtool_drivers.digitiser.digitiser import Digitiser

__all__ = ["Digitiser"]
