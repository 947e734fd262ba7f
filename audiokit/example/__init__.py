"""A seeded generator of an invented cohort, complete with the faults that real files have."""
