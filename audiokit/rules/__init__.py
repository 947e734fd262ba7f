"""Jurisdictions as data files, and the strict parser that reads them."""
