"""What every test shares: Jupyter's slow optional grammar is left out before anything can import it."""

import sys

# jsonschema, which nbformat imports, would build a grammar for an IRI check that takes seconds; it does without.
sys.modules.setdefault("rfc3987_syntax", None)  # type: ignore[arg-type]
