"""Instrument automation and test sequencing for two-port RF parts.

Nothing is imported here: each command of the command line imports what it needs, when it
needs it, so that help answers at once.
"""

__version__ = "0.1.0"
