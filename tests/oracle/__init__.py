"""A scalar re-implementation of the yearly review, written apart from the package, and what compares the two.

Nothing here imports `audiokit` except the one call in `compare.run_command`: two programs that share code share errors.
"""
