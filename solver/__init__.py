"""The numbers' side of Fluxface: a case folder in, a result folder out; no 3D suite needed."""

__version__ = "0.1.0"
