"""Views of a run: they read events and outcomes, and compute nothing."""
