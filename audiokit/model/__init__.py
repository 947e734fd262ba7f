"""The aligned arrays that all arithmetic runs on."""
