"""The verbs about design files."""
