"""Surfaces and the tetrahedra that fill them."""
