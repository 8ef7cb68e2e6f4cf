"""What a run leaves: the payload, the signed folder, keys and trust, and the ways to check them.

A record is a folder. ``envelope.json`` in it is a DSSE envelope around an in-toto Statement whose subjects
are all other files of the folder, each by its SHA-256; nothing in the folder is outside of the signature.
The folder appears whole, by one rename, or not at all.

The room writes and reads files of records and keys; it prints nothing, asks nobody and touches no
instrument. Heavy imports (signatures) happen inside the functions that need them.
"""
