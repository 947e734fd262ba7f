"""Panels: views over the package, no arithmetic of their own."""
