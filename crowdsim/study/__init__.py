"""The loops over realisations: from a scenario to results.

Depends on every room but plots and report.
"""
