"""What every user of a model value must know, and what this program is."""

from __future__ import annotations

from PySide6.QtWidgets import QMessageBox, QWidget

import spreadgui

CAUTIONS = (
    "A model value is no quote: nobody has offered to deal at it.",
    "Every option, and every day of a strip, is valued as exercised once, on its expiry (European exercise).",
    "Forwards are taken as lognormal, as lognormal with a shift, or as normal, whichever their market says, with "
    "volatilities and a correlation that stay constant. Prices that jump and spike follow none of these laws, and the "
    "choice of the law alone can move a value by more than any formula gap.",
    "A closed form can be wrong by more than a bid-offer spread; grid and Reading show its gap against the Yardstick. "
    "The Yardstick is exact for the model, not for the market.",
    "Volatilities and above all correlations are estimates; the value moves with them. An implied correlation holds "
    "only with the law and the volatilities it was backed out with.",
    "Independent validation and the risk policy of your desk come before any figure shown here.",
)


def show_cautions(parent: QWidget) -> None:
    """The cautions in a window of their own."""
    _show(parent, "Model cautions", "What these values are, and what they are not", CAUTIONS)


def show_about(parent: QWidget) -> None:
    """Name and version."""
    about = (
        f"spreadgui {spreadgui.__version__} values books of options on two correlated underlyings.",
        "The Ardenmoor market of its demo book is invented.",
    )
    _show(parent, "About spreadgui", "spreadgui", about)


def _show(parent: QWidget, title: str, heading: str, sentences: tuple[str, ...]) -> None:
    box = QMessageBox(parent)
    box.setWindowTitle(title)
    box.setText(heading)
    box.setInformativeText("\n\n".join(sentences))
    box.exec()
