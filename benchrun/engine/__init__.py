"""From a plan to a record: the step loop, safe state, journal and operators.

May import: record, instruments, evaluate, sequence, scpi and what lies below. Imports no screen:
whoever wants to see a run gives it a sink for its events.
"""
