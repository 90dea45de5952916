"""Frozen records in SI units, validated at birth; they know nothing else of benchtool."""
