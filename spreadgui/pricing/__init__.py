"""Published methods for options on the spread of two forwards: arrays in, arrays out, NumPy and SciPy only.

Every method module has `value` and `sensitivities` of the same arguments; `methods` declares them all.
"""

from spreadgui.pricing import bjerksund_stensland, black76, kirk, margrabe, modified_kirk, yardstick

__all__ = ["bjerksund_stensland", "black76", "kirk", "margrabe", "modified_kirk", "yardstick"]
