"""Tags and face numbers carried from one surface to another that stands for it."""

from __future__ import annotations

import numpy as np
from scipy.spatial import cKDTree

from ..case import Surface
from .surface import area_vectors, areas, distances, triangle_corners

SAMPLES = 60_000
CANDIDATES = 12
LIKE = 0.5  # cosine between normals of faces that may stand for each other


def carried(source: Surface, vertices: np.ndarray, triangles: np.ndarray) -> Surface:
    """Triangles (F, 3) over vertices (V, 3), each with the tag and face of the nearest of ``source`` of like normal."""
    corners, origin = vertices[triangles], triangle_corners(source)
    points, owner = _samples(origin)
    places = corners.mean(axis=1)
    _, near = cKDTree(points).query(places, min(CANDIDATES, len(points)))
    near = owner[near.reshape(len(places), -1)]
    rows = np.repeat(np.arange(len(places)), near.shape[1])
    apart = distances(places[rows], origin[near.ravel()]).reshape(near.shape)
    cosine = np.einsum("fi,fki->fk", _normals(corners), _normals(origin)[near])
    best = np.lexsort((apart, cosine < LIKE), axis=1)[:, 0]
    nearest = near[np.arange(len(places)), best]
    return Surface(
        np.asarray(vertices, np.float64),
        np.asarray(triangles, np.int32),
        source.part[nearest],
        source.tag[nearest],
        source.face[nearest],
    )


def _normals(corners: np.ndarray) -> np.ndarray:
    vectors = area_vectors(corners)
    return vectors / np.maximum(np.linalg.norm(vectors, axis=1, keepdims=True), np.finfo(float).tiny)


def _samples(corners: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Points (S, 3) all over triangles (F, 3, 3), one in the middle of each and the rest by area; their triangles."""
    area = areas(corners)
    more = np.floor(SAMPLES * area / area.sum()).astype(np.int64)
    owner = np.repeat(np.arange(len(corners)), more)
    u, v = np.random.default_rng(0).random((2, len(owner)))
    beyond = u + v > 1
    u, v = np.where(beyond, 1 - u, u), np.where(beyond, 1 - v, v)
    a, b, c = corners[owner, 0], corners[owner, 1], corners[owner, 2]
    spread = a + u[:, None] * (b - a) + v[:, None] * (c - a)
    return np.concatenate([corners.mean(axis=1), spread]), np.concatenate([np.arange(len(corners)), owner])


def tag_areas(surface: Surface, count: int) -> np.ndarray:
    """(count + 1,) m2 of each tag, the untagged faces last."""
    return np.bincount(surface.tag % (count + 1), areas(triangle_corners(surface)), count + 1)
