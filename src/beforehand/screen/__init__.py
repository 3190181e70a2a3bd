"""Text for a terminal, made from a lock, a review, a replay or a story by pure functions.

Nothing here reads a file, the environment or the terminal: the width and the use of colour are
arguments. Every text can be read without colour.
"""
