"""Force to motion: the kernels (the one file with numba), Newmark's schemes, the time step.

Depends on numpy and numba. Sees no scenario and no file.
"""
