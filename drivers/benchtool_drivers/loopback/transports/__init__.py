"""The transports that a simulated instrument is served over."""
