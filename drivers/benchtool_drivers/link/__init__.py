"""The link: one way to talk to an instrument, whatever carries the bytes.

``Link`` asks and is answered whole or raises; ``LinkSettings`` says how the instrument talks;
``ExchangeLog`` writes down what was said.
"""

from benchtool_drivers.link.exchange import ExchangeLog
from benchtool_drivers.link.link import Link
from benchtool_drivers.link.settings import LinkSettings

__all__ = ["ExchangeLog", "Link", "LinkSettings"]
