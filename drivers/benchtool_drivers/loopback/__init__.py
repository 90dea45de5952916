"""The simulated instrument: something to try the live commands on with nothing attached."""
