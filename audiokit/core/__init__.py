"""Words, errors and calendar arithmetic that every room shares."""
