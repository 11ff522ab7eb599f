"""The ramps of the Landscape: colours for a number, even in lightness. No Qt here."""

import numpy as np
from numpy.typing import NDArray

from spreadgui.desk.look.tokens import Palette, rgb

Bytes = NDArray[np.uint8]
Floats = NDArray[np.float64]


def sequential(palette: Palette, count: int = 256) -> Bytes:
    """The ramp for a quantity of one sign: the pane's ground at the low end, deep kelp at the high end.

    Returns an array (count, 3) of red, green, blue, 0 to 255. CIE lightness moves evenly from row to row and always
    in one direction, so equal steps of the quantity look equal, in grey print too. ValueError if count < 2.
    """
    return _ramp((palette.panel, palette.half_kelp, palette.kelp, palette.deep_kelp), count)


def diverging(palette: Palette, count: int = 257) -> Bytes:
    """The ramp for a signed quantity: brick below zero, the pane's ground at zero, kelp above.

    Returns an array (count, 3) of red, green, blue, 0 to 255. Row (count - 1) / 2 of an odd count is the ground
    itself; the two arms move away from it with the same lightness, so plus and minus weigh the same. ValueError if
    count < 3 or even, since an even count has no row for zero.
    """
    if count < 3 or count % 2 == 0:
        raise ValueError(f"count: expected an odd number from 3, found {count}")
    half = count // 2 + 1
    below = _ramp((palette.panel, palette.half_brick, palette.brick, palette.deep_brick), half, end=palette.deep_kelp)
    above = _ramp((palette.panel, palette.half_kelp, palette.kelp, palette.deep_kelp), half)
    return np.concatenate([below[:0:-1], above])


def lightness(rows: Bytes) -> Floats:
    """CIE 1976 lightness L*, 0 to 100, of rows (n, 3) of red, green, blue, 0 to 255."""
    return _to_lab(np.asarray(rows, dtype=np.float64) / 255)[:, 0]


def _ramp(stops: tuple[str, ...], count: int, end: str | None = None) -> Bytes:
    """`count` rows through the hues of `stops`, CIE lightness even from the first stop to `end` (or the last)."""
    if count < 2:
        raise ValueError(f"count: expected 2 or more, found {count}")
    lab = _to_lab(np.array([rgb(stop) for stop in stops], dtype=np.float64) / 255)
    last = lab[-1, 0] if end is None else _to_lab(np.array([rgb(end)], dtype=np.float64) / 255)[0, 0]
    level = np.linspace(lab[0, 0], last, count)
    # Each stop sits where its own lightness falls, so that it keeps its colour and the lightness stays a straight line.
    order = np.argsort(lab[:, 0])
    hue = [np.interp(level, lab[order, 0], lab[order, channel]) for channel in (1, 2)]
    colours = _from_lab(np.column_stack([level, *hue]))
    return np.rint(np.clip(colours, 0, 1) * 255).astype(np.uint8)


# sRGB primaries and white D65 to CIE XYZ (IEC 61966-2-1).
_TO_XYZ = np.array([[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]])
_WHITE = _TO_XYZ.sum(axis=1)


def _to_lab(colours: Floats) -> Floats:
    """CIE L*a*b* of sRGB rows (n, 3), 0 to 1 (CIE 15:2004)."""
    light = np.where(colours <= 0.04045, colours / 12.92, ((colours + 0.055) / 1.055) ** 2.4)
    share = light @ _TO_XYZ.T / _WHITE
    root = np.where(share > (6 / 29) ** 3, np.cbrt(share), share * (29 / 6) ** 2 / 3 + 4 / 29)
    x, y, z = root.T
    return np.column_stack([116 * y - 16, 500 * (x - y), 200 * (y - z)])


def _from_lab(lab: Floats) -> Floats:
    """sRGB rows (n, 3) of CIE L*a*b*; values outside 0 to 1 are colours that no screen can show."""
    y = (lab[:, 0] + 16) / 116
    root = np.column_stack([y + lab[:, 1] / 500, y, y - lab[:, 2] / 200])
    share = np.where(root > 6 / 29, root**3, 3 * (6 / 29) ** 2 * (root - 4 / 29))
    light = np.clip((share * _WHITE) @ np.linalg.inv(_TO_XYZ).T, 0, None)
    channels: Floats = np.where(light <= 0.0031308, light * 12.92, 1.055 * light ** (1 / 2.4) - 0.055)
    return channels
