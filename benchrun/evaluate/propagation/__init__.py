"""Uncertainty propagated through what was actually done: calibration, correction, de-embedding, figures.

``trail`` says what was done, ``influences`` what each source changes in each reading, ``kernel`` turns draws
into corrected planes, ``quantities`` takes the judged figures from them, ``propagate`` runs the trials.
"""
