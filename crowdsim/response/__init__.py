"""Measures across realisations: percentiles, distribution-free intervals, summaries.

Depends on numpy and scipy.special. Sees no scenario and no file.
"""
