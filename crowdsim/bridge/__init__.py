"""What vibrates: modes with frequencies, damping, modal masses and ordinates.

Depends on numpy and scipy.interpolate. Sees no scenario and no file.
"""
