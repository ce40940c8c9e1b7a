"""Measures across realisations: percentiles, windows, verdicts, laws of maxima, paired changes.

Depends on numpy, and scipy.special on use. Sees no scenario and no file.
"""
