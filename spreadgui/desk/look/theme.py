"""A theme and how it is put on: Fusion, an own palette and an own style sheet, in the sizes of the user's text.

Everything is set on the application, so that another theme can be put on at run time and nothing of the first stays:
`apply` replaces the palette, the font and the whole style sheet.
"""

from dataclasses import dataclass, fields, replace
from pathlib import Path
from string import Template

from PySide6.QtCore import Qt
from PySide6.QtGui import QColor, QFont, QFontInfo, QPalette, QTextCharFormat
from PySide6.QtWidgets import QApplication, QCalendarWidget, QWidget

from spreadgui.desk.look.tokens import DARK, LIGHT, Palette

_HERE = Path(__file__).parent
# What the user's system said before this program put its own palette and font on, kept by the application itself.
_SYSTEM_DARK = "systemPrefersDark"
_SYSTEM_POINTS = "systemTextPoints"


@dataclass(frozen=True, slots=True)
class Theme:
    """A palette and the size, in points, of running text; every other size is a share of it."""

    palette: Palette
    points: float

    @property
    def small(self) -> float:
        """Points of subtitles, headings of columns and captions."""
        return round(self.points * 0.9, 1)

    @property
    def title(self) -> float:
        """Points of the title of a pane."""
        return round(self.points * 1.06, 1)

    @property
    def figure(self) -> float:
        """Points of a headline number."""
        return round(self.points * 1.7, 1)

    @property
    def is_dark(self) -> bool:
        """Whether text is lighter than its ground."""
        return self.palette.is_dark

    def colour(self, token: str) -> QColor:
        """The colour of a field of the palette, for painters; AttributeError if there is none of that name."""
        return QColor(getattr(self.palette, token))

    def scaled(self, factor: float) -> "Theme":
        """The same theme with text `factor` times as large."""
        return replace(self, points=self.points * factor)

    def switched(self) -> "Theme":
        """The same sizes in the other palette: dark for light, light for dark."""
        return replace(self, palette=LIGHT if self.is_dark else DARK)


def system_prefers_dark(app: QApplication) -> bool:
    """Whether the user's system is set to dark.

    The platform is asked first. Bare xcb and offscreen do not know, so there the lightness of the palette that the
    program was started with decides; it is remembered before `apply` puts another one on.
    """
    scheme = app.styleHints().colorScheme()
    if scheme != Qt.ColorScheme.Unknown:
        return scheme == Qt.ColorScheme.Dark
    _remember_system(app)
    return bool(app.property(_SYSTEM_DARK))


def system_points(app: QApplication) -> float:
    """Points of running text that the user's system asks for, whatever theme is on."""
    _remember_system(app)
    return float(app.property(_SYSTEM_POINTS))


def theme_for(app: QApplication, *, dark: bool | None = None) -> Theme:
    """The theme in the user's text size: dark, light, or (None) as the system is set."""
    is_dark = system_prefers_dark(app) if dark is None else dark
    return Theme(DARK if is_dark else LIGHT, system_points(app))


def apply(app: QApplication, theme: Theme) -> None:
    """Put `theme` on the whole program, in place of the one that was on."""
    _remember_system(app)
    if app.style().objectName() != "fusion":
        app.setStyle("Fusion")
    font = tabular(app.font())
    font.setPointSizeF(theme.points)
    app.setFont(font)
    app.setPalette(colours(theme.palette))
    app.setStyleSheet(stylesheet(theme))


def tabular(font: QFont) -> QFont:
    """A copy of `font` whose figures are all of one width, so that decimals stand below each other."""
    copy = QFont(font)
    copy.setFeature(QFont.Tag("tnum"), 1)
    return copy


def set_tone(widget: QWidget, tone: str) -> None:
    """Colour a label by meaning: "" (ink), "muted", "accent", "amber" or "brick". The words must say it too."""
    _set_look(widget, "tone", tone)


def set_rank(widget: QWidget, rank: str) -> None:
    """Size a label by its rank: "" (running text), "small", "title", "figure" or "figure-small"."""
    _set_look(widget, "rank", rank)


def set_refused(widget: QWidget, refused: bool) -> None:
    """Show an entry as refused (brick edge and ground) or as sound. The reason must stand beside it in words."""
    _set_look(widget, "state", "refused" if refused else "")


def set_focus_within(widget: QWidget, within: bool) -> None:
    """Draw the edge of a pane in the accent while the keyboard is inside it."""
    _set_look(widget, "focusWithin", within)


def calm_calendar(calendar: QCalendarWidget, theme: Theme) -> None:
    """Weekends muted in place of Qt's own red, which no style sheet reaches; no week numbers. Again after `apply`."""
    calendar.setVerticalHeaderFormat(QCalendarWidget.VerticalHeaderFormat.NoVerticalHeader)
    weekend = QTextCharFormat()
    weekend.setForeground(theme.colour("muted"))
    for day in (Qt.DayOfWeek.Saturday, Qt.DayOfWeek.Sunday):
        calendar.setWeekdayTextFormat(day, weekend)


def stylesheet(theme: Theme) -> str:
    """The program's style sheet with the colours and sizes of `theme`."""
    palette = theme.palette
    values: dict[str, object] = {token.name: getattr(palette, token.name) for token in fields(palette)}
    values |= {
        "kelp_hover": palette.kelp_hover,
        "selected": palette.selected,
        "small": theme.small,
        "title": theme.title,
        "figure": theme.figure,
        "figure_small": round(theme.points * 1.25, 1),
        "glyphs": (_HERE / "glyphs" / palette.name).as_posix(),
    }
    return Template((_HERE / "program.qss").read_text(encoding="utf-8")).substitute(values)


def colours(palette: Palette) -> QPalette:
    """The palette of Qt's own painting: views that draw themselves, editors, dialogs of the system's toolkit."""
    made = QPalette()
    for role, colour in _roles(palette).items():
        made.setColor(QPalette.ColorGroup.All, role, QColor(colour))
    faded = (QPalette.ColorRole.WindowText, QPalette.ColorRole.Text, QPalette.ColorRole.ButtonText)
    for role in (*faded, QPalette.ColorRole.HighlightedText):
        made.setColor(QPalette.ColorGroup.Disabled, role, QColor(palette.muted))
    made.setColor(QPalette.ColorGroup.Disabled, QPalette.ColorRole.Highlight, QColor(palette.line))
    return made


def _roles(palette: Palette) -> dict[QPalette.ColorRole, str]:
    role = QPalette.ColorRole
    return {
        role.Window: palette.paper,
        role.WindowText: palette.ink,
        role.Base: palette.panel,
        role.AlternateBase: palette.raised,
        role.Text: palette.ink,
        role.Button: palette.raised,
        role.ButtonText: palette.ink,
        role.BrightText: palette.brick,
        role.Highlight: palette.kelp_soft,
        role.HighlightedText: palette.ink,
        role.Accent: palette.kelp,
        role.Link: palette.kelp,
        role.LinkVisited: palette.kelp,
        role.ToolTipBase: palette.raised,
        role.ToolTipText: palette.ink,
        role.PlaceholderText: palette.muted,
        role.Light: palette.raised,
        role.Midlight: palette.line,
        role.Mid: palette.edge,
        role.Dark: palette.muted,
        role.Shadow: palette.ink if not palette.is_dark else palette.on_kelp,
    }


def _remember_system(app: QApplication) -> None:
    if app.property(_SYSTEM_POINTS) is not None:
        return
    palette = app.palette()
    text, ground = palette.windowText().color(), palette.window().color()
    app.setProperty(_SYSTEM_DARK, text.lightnessF() > ground.lightnessF())
    # A font given in pixels has no points of its own; QFontInfo tells the points that it comes out at.
    app.setProperty(_SYSTEM_POINTS, QFontInfo(app.font()).pointSizeF())


def _set_look(widget: QWidget, name: str, value: object) -> None:
    """Set a property that the style sheet selects by, and let the sheet look at the widget again."""
    if widget.property(name) == value:
        return
    widget.setProperty(name, value)
    style = widget.style()
    style.unpolish(widget)
    style.polish(widget)
