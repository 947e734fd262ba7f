"""Pure array arithmetic on thresholds."""
