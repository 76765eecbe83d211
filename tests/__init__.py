"""Tests; a package, so that another installed `tests` cannot stand in its place."""
