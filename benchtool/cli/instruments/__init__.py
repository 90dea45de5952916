"""The verbs of ``benchtool instruments``."""
