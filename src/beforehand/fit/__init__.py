"""Exact least squares and what is judged by it; no input, output or global state."""
