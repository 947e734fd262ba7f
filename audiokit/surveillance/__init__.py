"""People through time: baselines, retests, events, worklist."""
