"""What a foot does: published sets of dynamic load factors for walking and jogging.

Depends on numpy only. Sees no scenario and no file. A load set is one function here and one
test in tests/published.
"""
