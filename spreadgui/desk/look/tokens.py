"""The colours of the program as plain values, and the pairs it sets text in. Needs neither Qt nor NumPy."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Palette:
    """One set of colours, each as "#RRGGBB".

    A `soft` colour is the ground that goes under text of the colour it is named for. `edge` draws the outline of
    a control, `line` the hairlines between cells and round panes; `on_kelp` is text on a ground of kelp. The `half`
    and `deep` colours stand only in the ramps of the Landscape.
    """

    name: str
    paper: str
    panel: str
    raised: str
    ink: str
    muted: str
    line: str
    edge: str
    kelp: str
    kelp_soft: str
    on_kelp: str
    amber: str
    amber_soft: str
    brick: str
    brick_soft: str
    entry: str
    half_kelp: str
    deep_kelp: str
    half_brick: str
    deep_brick: str

    @property
    def is_dark(self) -> bool:
        """Whether text is lighter than the ground it stands on."""
        return luminance(self.ink) > luminance(self.panel)

    @property
    def kelp_hover(self) -> str:
        """A ground of kelp with the pointer on it."""
        return mix(self.kelp, self.ink, 0.18)

    @property
    def selected(self) -> str:
        """The ground of words selected inside an entry."""
        return mix(self.kelp_soft, self.kelp, 0.16)


LIGHT = Palette(
    name="light",
    paper="#F6F4EE",
    panel="#FFFFFF",
    raised="#FBFAF6",
    ink="#1D2A32",
    muted="#58646D",
    line="#E2DDD2",
    edge="#C6C0B2",
    kelp="#0E6A63",
    kelp_soft="#DCEBE7",
    on_kelp="#FFFFFF",
    amber="#965800",
    amber_soft="#FBEFD9",
    brick="#A03A2C",
    brick_soft="#F9E4DF",
    entry="#FFFDF5",
    half_kelp="#93CDBE",
    deep_kelp="#08434A",
    half_brick="#E3A598",
    deep_brick="#6E2118",
)

DARK = Palette(
    name="dark",
    paper="#12191D",
    panel="#182126",
    raised="#1D282E",
    ink="#E6E9E6",
    muted="#9AA7AE",
    line="#2A363D",
    edge="#43525B",
    kelp="#4DB8AA",
    kelp_soft="#1F3B3A",
    on_kelp="#0B1417",
    amber="#E2A84B",
    amber_soft="#3A2F1B",
    brick="#E58472",
    brick_soft="#40261F",
    entry="#1E2726",
    half_kelp="#2A756E",
    deep_kelp="#C3EBDD",
    half_brick="#96493A",
    deep_brick="#F9D3C9",
)

# Every pair (text, ground) that the program sets text in, by field of Palette. A view that needs another pair adds it
# here first, so that the contrast test sees it.
_GROUNDS = ("paper", "panel", "raised", "entry")
TEXT_PAIRS: tuple[tuple[str, str], ...] = (
    *((text, ground) for text in ("ink", "muted", "kelp", "amber", "brick") for ground in (*_GROUNDS, "kelp_soft")),
    ("ink", "amber_soft"),
    ("amber", "amber_soft"),
    ("ink", "brick_soft"),
    ("brick", "brick_soft"),
    ("on_kelp", "kelp"),
    ("on_kelp", "kelp_hover"),
    ("ink", "selected"),
    ("ink", "line"),
)

# Pairs (mark, ground) of what is seen but not read - focus edges, check boxes, dots: WCAG asks 3 : 1 of them.
MARK_PAIRS: tuple[tuple[str, str], ...] = tuple(
    (mark, ground) for mark in ("kelp", "muted", "amber", "brick") for ground in _GROUNDS
)


def rgb(colour: str) -> tuple[int, int, int]:
    """Red, green and blue, 0 to 255, of "#RRGGBB"; ValueError for anything else.

    >>> rgb("#0E6A63")
    (14, 106, 99)
    """
    if len(colour) != 7 or not colour.startswith("#"):
        raise ValueError(f"colour: expected #RRGGBB, found {colour!r}")
    return int(colour[1:3], 16), int(colour[3:5], 16), int(colour[5:7], 16)


def luminance(colour: str) -> float:
    """Relative luminance of "#RRGGBB", 0 (black) to 1 (white), as WCAG 2.2 defines it."""
    red, green, blue = (_linear(channel / 255) for channel in rgb(colour))
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


def contrast(first: str, second: str) -> float:
    """Contrast ratio of two colours, 1 to 21, as WCAG 2.2 defines it; the order does not matter.

    >>> contrast("#FFFFFF", "#000000")
    21.0
    """
    low, high = sorted((luminance(first), luminance(second)))
    return (high + 0.05) / (low + 0.05)


def mix(first: str, second: str, share: float) -> str:
    """The colour that lies `share` (0 to 1) of the way from first to second, channel by channel.

    >>> mix("#000000", "#FFFFFF", 0.5)
    '#808080'
    """
    parts = (round(a + (b - a) * share) for a, b in zip(rgb(first), rgb(second), strict=True))
    return "#" + "".join(f"{part:02X}" for part in parts)


def _linear(channel: float) -> float:
    """Light of one sRGB channel, both 0 to 1 (IEC 61966-2-1)."""
    return channel / 12.92 if channel <= 0.04045 else float(((channel + 0.055) / 1.055) ** 2.4)
