"""The steps of a plan: each takes a state and gives the next, with the rulings that led there."""
