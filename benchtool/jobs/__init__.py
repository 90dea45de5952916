"""Loops over live sources: acquire, watch. They print nothing and are told what to do next."""
