"""The criteria by the name that a scenario gives them."""

from __future__ import annotations

from crowdsim.guides.criterion import Criterion
from crowdsim.guides.en_1990 import EN_1990
from crowdsim.guides.eur_23984 import EUR_23984
from crowdsim.guides.setra_2006 import SETRA_2006

CRITERIA: dict[str, Criterion] = {c.key: c for c in (EUR_23984, SETRA_2006, EN_1990)}
