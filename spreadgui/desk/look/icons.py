"""The program's drawings as icons in the colours of a theme."""

from pathlib import Path

from PySide6.QtCore import QByteArray, QObject, QRectF, QSize, Qt
from PySide6.QtGui import QAction, QGuiApplication, QIcon, QPainter, QPixmap
from PySide6.QtSvg import QSvgRenderer
from PySide6.QtWidgets import QAbstractButton

from spreadgui import shipped
from spreadgui.desk.look.theme import Theme
from spreadgui.desk.look.tokens import mix

# The program's mark keeps its own colours and is wanted large; every other drawing is wanted at the sizes of controls.
MARK = "app"
_NAME = "iconName"
_CONTROL_SIZES = (16, 20, 24, 32)
_MARK_SIZES = (16, 20, 24, 32, 48, 64, 128, 256)


def icon(name: str, theme: Theme) -> QIcon:
    """The drawing `name` in the theme's colours: ink, faint when disabled, accent when on or under the pointer.

    Drawn for the pixel density of every screen there is, in fixed colours: ask again, or `renew_icons`, after another
    theme is put on. KeyError if there is no such drawing.
    """
    source = _source(name)
    made = QIcon()
    if name == MARK:
        _add(made, source, _MARK_SIZES, QIcon.Mode.Normal, QIcon.State.Off)
        return made
    normal, disabled, active = QIcon.Mode.Normal, QIcon.Mode.Disabled, QIcon.Mode.Active
    palette = theme.palette
    _add(made, coloured(source, palette.ink), _CONTROL_SIZES, normal, QIcon.State.Off)
    _add(made, coloured(source, palette.kelp), _CONTROL_SIZES, normal, QIcon.State.On)
    _add(made, coloured(source, palette.kelp), _CONTROL_SIZES, active, QIcon.State.Off)
    faint = mix(palette.panel, palette.muted, 0.55)
    # Qt would make the missing picture of a disabled act that is on out of the accent, not out of the faint one.
    for state in (QIcon.State.Off, QIcon.State.On):
        _add(made, coloured(source, faint), _CONTROL_SIZES, disabled, state)
    return made


def set_icon(target: QAction | QAbstractButton, name: str, theme: Theme) -> None:
    """Give an act or a button the drawing `name`, and note it there for `renew_icons`; KeyError as for `icon`."""
    target.setIcon(icon(name, theme))
    target.setProperty(_NAME, name)


def renew_icons(root: QObject, theme: Theme) -> None:
    """Colour anew every icon below `root` that `set_icon` gave: for after another theme is put on."""
    targets: list[QAction | QAbstractButton] = [*root.findChildren(QAction), *root.findChildren(QAbstractButton)]
    for target in targets:
        name = target.property(_NAME)
        if name:
            target.setIcon(icon(name, theme))


def picture(name: str, colour: str, size: int, ratio: float = 1.0) -> QPixmap:
    """One drawing in one colour ("#RRGGBB"), `size` by `size`, for a screen with `ratio` pixels to a unit of length.

    For labels and for painters; KeyError if there is no such drawing.
    """
    return _draw(QSvgRenderer(QByteArray(coloured(_source(name), colour).encode())), size, ratio)


def names() -> tuple[str, ...]:
    """Every drawing there is, in alphabetical order."""
    return tuple(sorted(path.stem for path in shipped.folder("icons").glob("*.svg")))


def coloured(source: str, colour: str) -> str:
    """The text of a drawing with `colour` in place of currentColor."""
    return source.replace("currentColor", colour)


def _source(name: str) -> str:
    path: Path = shipped.icon(name)
    if not path.is_file():
        raise KeyError(f"icon: no drawing {name!r}")
    return path.read_text(encoding="utf-8")


def _add(made: QIcon, source: str, sizes: tuple[int, ...], mode: QIcon.Mode, state: QIcon.State) -> None:
    ratios = {1.0, *(screen.devicePixelRatio() for screen in QGuiApplication.screens())}
    renderer = QSvgRenderer(QByteArray(source.encode()))
    for size in sizes:
        for ratio in sorted(ratios):
            made.addPixmap(_draw(renderer, size, ratio), mode, state)


def _draw(renderer: QSvgRenderer, size: int, ratio: float) -> QPixmap:
    side = round(size * ratio)
    drawn = QPixmap(QSize(side, side))
    drawn.fill(Qt.GlobalColor.transparent)
    painter = QPainter(drawn)
    renderer.render(painter, QRectF(0, 0, side, side))
    painter.end()
    drawn.setDevicePixelRatio(ratio)
    return drawn
