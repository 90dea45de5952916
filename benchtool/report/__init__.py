"""Shows an analysis: on screen, as a page, as JSON. Computes nothing."""
