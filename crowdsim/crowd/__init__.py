"""Who walks: populations, arrivals, and the persons of one realisation.

Depends on nothing but numpy and scipy.special. Sees no scenario and no file.
"""
