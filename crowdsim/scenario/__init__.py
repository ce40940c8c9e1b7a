"""What the engineer wrote: schema, reader with readable errors, units, sanity check.

Depends on bridge, crowd, loads, dynamics (for the step) and errors. Everything that is computed
later starts from a Scenario that was read here without a problem.
"""
