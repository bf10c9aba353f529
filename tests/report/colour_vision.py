"""Colours as other eyes and a grey print see them."""

from itertools import combinations

import numpy as np

# G. M. Machado, M. M. Oliveira, L. A. F. Fernandes, IEEE Trans. Vis. Comput. Graph. 15, 1291 (2009), severity 1.0, on
# linear RGB (published; memory; each row adds up to 1, so that greys stay grey).
MACHADO = {
    "protanopia": [
        [0.152286, 1.052583, -0.204868],
        [0.114503, 0.786281, 0.099216],
        [-0.003882, -0.048116, 1.051998],
    ],
    "deuteranopia": [
        [0.367322, 0.860646, -0.227968],
        [0.280085, 0.672501, 0.047413],
        [-0.011820, 0.042940, 0.968881],
    ],
    "tritanopia": [
        [1.255528, -0.076749, -0.178779],
        [-0.078411, 0.930809, 0.147602],
        [0.004733, 0.691367, 0.303900],
    ],
    "full colour vision": np.eye(3),
}

# Linear sRGB to XYZ under D65 (IEC 61966-2-1:1999; memory).
TO_XYZ = np.array([[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]])


def linear(colour):
    values = np.array([int(colour[k : k + 2], 16) for k in (1, 3, 5)]) / 255
    return np.where(values <= 0.04045, values / 12.92, ((values + 0.055) / 1.055) ** 2.4)


def seen(colour, vision):
    """Linear RGB as that vision has it."""
    return (np.array(MACHADO[vision]) @ linear(colour)).clip(0, 1)


def lab(linear_rgb):
    """CIELAB 1976 coordinates under D65."""
    ratio = TO_XYZ @ linear_rgb / TO_XYZ.sum(axis=1)
    f = np.where(ratio > (6 / 29) ** 3, np.cbrt(ratio), ratio / (3 * (6 / 29) ** 2) + 4 / 29)
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


def lightness(colour):
    """CIELAB lightness, 0 to 100: what a grey print keeps."""
    return float(lab(linear(colour))[0])


def contrast(one, other):
    """Contrast ratio of the Web Content Accessibility Guidelines 2.1."""
    low, high = sorted(float(TO_XYZ[1] @ linear(colour)) for colour in (one, other))
    return (high + 0.05) / (low + 0.05)


def smallest_difference(colours, vision):
    """Smallest CIELAB distance between any two."""
    points = [lab(seen(colour, vision)) for colour in colours]
    return min(float(np.linalg.norm(a - b)) for a, b in combinations(points, 2))
