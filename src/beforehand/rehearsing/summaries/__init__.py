"""From replicates to figures: one module a scenario, pure functions all."""

from beforehand.rehearsing.summaries.expected import expected_figures
from beforehand.rehearsing.summaries.hold_out import hold_out_figures
from beforehand.rehearsing.summaries.noise import noise_figures
from beforehand.rehearsing.summaries.resample import resample_figures

__all__ = ["expected_figures", "hold_out_figures", "noise_figures", "resample_figures"]
