"""Rehearsal: what a plan does to noise, to the effects that are expected, to another sample."""
