"""Where the camera stands, and between places in the world and pixels of the picture."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

# Far enough for calm perspective, near enough that it is still felt; in radii of what is seen.
DISTANCE = 6.0

# From the parts to the eye when the scene has no camera: before them, to the right and above.
THREE_QUARTER = (0.62, -0.90, 0.55)

# The sides a part is shown from, by the names the host has for them: from the parts to the eye.
VIEWS = {
    "front": (0.0, -1.0, 0.0),
    "right": (1.0, 0.0, 0.0),
    "back": (0.0, 1.0, 0.0),
    "left": (-1.0, 0.0, 0.0),
    "top": (0.0, 0.0, 1.0),
    "bottom": (0.0, 0.0, -1.0),
    "three-quarter": THREE_QUARTER,
}


@dataclass(frozen=True)
class Frame:
    """A camera and the picture it fills.

    eye: (3,) world. axes: (3, 3), rows right, up and towards the eye. size: width and height in pixels.
    focal: pixels that a unit spans at a distance of one unit. middle: (2,) the pixel that the axis goes through.
    distance: from the eye to the middle of what is seen. Pixels are counted from the picture's lower left corner.
    """

    eye: np.ndarray
    axes: np.ndarray
    size: tuple[int, int]
    focal: float
    middle: np.ndarray
    distance: float

    def pixels(self, places: np.ndarray) -> np.ndarray:
        """Pixels (..., 2) of world places (..., 3) in front of the eye."""
        seen = (places - self.eye) @ self.axes.T
        return self.focal * seen[..., :2] / -seen[..., 2:] + self.middle

    def pixel_size(self, places: np.ndarray) -> np.ndarray:
        """World lengths (...,) that one pixel spans at ``places`` (..., 3)."""
        return (self.eye - places) @ self.axes[2] / self.focal

    def pane(self, distance: float) -> np.ndarray:
        """The matrix (4, 4) that takes pixels (x, y, 0) to the world, on a pane at ``distance`` before the eye."""
        pixel = distance / self.focal
        corner = self.eye - distance * self.axes[2] - pixel * (self.middle @ self.axes[:2])
        matrix = np.eye(4)
        matrix[:3, :3] = pixel * self.axes.T
        matrix[:3, 3] = corner
        return matrix


def looking(towards_eye: np.ndarray) -> np.ndarray:
    """Camera axes (3, 3), upright in the world's z, for the direction from what is seen to the eye."""
    back = towards_eye / np.linalg.norm(towards_eye)
    right = np.cross((0.0, 0.0, 1.0), back)
    if np.linalg.norm(right) < 1e-6:
        right = np.array((1.0, 0.0, 0.0))
    right /= np.linalg.norm(right)
    return np.stack([right, np.cross(back, right), back])


def framed(
    places: np.ndarray, axes: np.ndarray, size: tuple[int, int], window: tuple[float, float, float, float]
) -> Frame:
    """The frame in which ``places`` (P, 3) just fill the window (left, bottom, right, top in pixels), centred in it."""
    centre = 0.5 * (places.min(axis=0) + places.max(axis=0))
    radius = max(float(np.linalg.norm(places - centre, axis=1).max()), 1e-9)
    distance = DISTANCE * radius
    eye = centre + distance * axes[2]
    bare = Frame(eye, axes, size, 1.0, np.zeros(2), distance).pixels(places)
    low, high = bare.min(axis=0), bare.max(axis=0)
    left, bottom, right, top = window
    focal = float(np.min(np.array((right - left, top - bottom)) / np.maximum(high - low, 1e-9)))
    middle = np.array((left + right, bottom + top)) / 2 - focal * (low + high) / 2
    return Frame(eye, axes, size, focal, middle, distance)
