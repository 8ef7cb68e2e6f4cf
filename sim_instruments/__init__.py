"""A physical test bench in software: instruments that speak SCPI, parts that obey physics.

Nothing here imports the product. Any PyVISA program can talk to a world, through the library object of
:mod:`sim_instruments.doors.visa` or over a socket.
"""
