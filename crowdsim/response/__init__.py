"""Measures across realisations: percentiles, distribution-free intervals, summaries.

Depends on numpy, and scipy.special on use. Sees no scenario and no file.
"""
