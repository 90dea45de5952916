"""Live instruments: links, dialects, serial streams, and an instrument to try them on.

Only this package knows pyvisa and pyserial. What it offers is the protocol of
``benchtool.instruments``.
"""
