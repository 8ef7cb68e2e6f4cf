"""Kinds of instruments: the driver knows what to do, its dialect file how a family words it."""
