"""The 3D suite's side of Fluxface."""
