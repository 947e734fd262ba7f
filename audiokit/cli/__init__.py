"""The command line: a thin view over the package."""
