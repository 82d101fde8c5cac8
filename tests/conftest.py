"""Its place here lets the tests of every room import ``published_data``."""
