"""The arithmetic of a sequence: calibrate, correct, de-embed, judge, as functions of raw readings.

No instrument, no file and no clock is touched here. The engine calls these functions while a run goes,
an audit calls them again on the readings kept in a record, and the uncertainty comes from calling them on
varied readings; all three must give the same numbers because there is only this one code path.
"""
