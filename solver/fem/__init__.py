"""Finite elements: reference shapes, volume and boundary terms, linear algebra."""
