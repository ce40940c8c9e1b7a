"""Who walks: populations, arrivals, and the persons of one realisation.

Depends on numpy. Sees no scenario and no file.
"""
