"""The one plain sentence of every ground; report, terminal and lock say the same because they ask here."""

from __future__ import annotations

from collections.abc import Mapping

from beforehand.steps.rulings import Ruling
from beforehand.wording.building import COLLINEARITY, DEPENDENCE, KEEP, MISSING_DATA, TRANSFORMS
from beforehand.wording.clauses import Sentence
from beforehand.wording.deciding import FINAL_CHECKS, INFLUENCE, SELECTION

SENTENCES: Mapping[str, Sentence] = {
    **MISSING_DATA,
    **TRANSFORMS,
    **DEPENDENCE,
    **KEEP,
    **COLLINEARITY,
    **INFLUENCE,
    **SELECTION,
    **FINAL_CHECKS,
}


def sentence(ruling: Ruling) -> str:
    """The one plain sentence of a ruling, made from its ground and evidence."""
    said = SENTENCES[ruling.ground](ruling)
    return said if said.endswith((".", "…")) else said + "."
