"""Files to tables and back: reading, mapping, validation, quarantine, decisions."""
