"""Published criteria and hand formulas, one a file; no file imports another but the kinds they share.

Depends on numpy. Sees no scenario and no file. A criterion is a constant in a
file of its own and an entry in `catalogue`; a formula is a function and one published test.
"""
