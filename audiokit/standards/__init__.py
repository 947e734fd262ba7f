"""Published tables as data, with the functions their standards define."""
