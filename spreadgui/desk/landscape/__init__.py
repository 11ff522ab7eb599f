"""The Landscape: one quantity of one position drawn over its two underlyings. Only this room imports pyqtgraph."""
