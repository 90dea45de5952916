"""Simulated instruments, by the structure of what they answer.

They are written from the structures themselves and share nothing with the dialect files and the
code that reads them: a formula that is wrong on one side does not agree with itself.
"""

from benchtool_drivers.loopback.families.making import FAMILIES, make_family

__all__ = ["FAMILIES", "make_family"]
