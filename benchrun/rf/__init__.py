"""Pure numbers of the trade: standards, error terms, calibration, de-embedding, figures, masks.

No file but Touchstone text, no instrument, no clock. Every function takes planes of shape ``(..., f)``
whose leading axes are Monte Carlo draws or variations, so nominal values and uncertainty share one path.
All reflection coefficients are linear and complex; decibels appear only where a name ends in ``_db``.
"""
