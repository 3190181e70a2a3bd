"""Every sentence that the program says about a ruling, made in one place from its ground.

Nothing here decides anything.
"""

from __future__ import annotations

from beforehand.wording.cautions import ALWAYS, FEW_ROWS_PER_COEFFICIENT, cautions
from beforehand.wording.phrases import CHECK_WORDS, RUNG_WORDS, limit_text, number, p_value, plural, share
from beforehand.wording.sentences import SENTENCES, sentence
from beforehand.wording.verdicts import verdict_of

__all__ = [
    "ALWAYS",
    "CHECK_WORDS",
    "FEW_ROWS_PER_COEFFICIENT",
    "RUNG_WORDS",
    "SENTENCES",
    "cautions",
    "limit_text",
    "number",
    "p_value",
    "plural",
    "sentence",
    "share",
    "verdict_of",
]
