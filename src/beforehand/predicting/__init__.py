"""The adopted equation on new cases: what it says of each, how sure it is, and where it does not reach."""

from beforehand.predicting.needs import prediction_in, wanted_by
from beforehand.predicting.text import COLUMNS, as_mapping, csv_text
from beforehand.predicting.whole import PredictedCase, Predictions, predictions

__all__ = [
    "COLUMNS",
    "PredictedCase",
    "Predictions",
    "as_mapping",
    "csv_text",
    "prediction_in",
    "predictions",
    "wanted_by",
]
