"""Figures of a results file, one a file: function(case, ax=None) -> Axes, and `draw` that saves one.

Depends on matplotlib (without pyplot), results, response, guides, study, crowd, bridge. Only this
room imports matplotlib; the figure files import what they share, never one another.
"""

from crowdsim.plots.draw import FIGURES, draw

__all__ = ["FIGURES", "draw"]
