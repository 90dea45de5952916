"""The verbs about parts."""
