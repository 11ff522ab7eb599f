"""For all tests: no screen is needed, and nothing reaches the user's own settings."""

import os

os.environ["QT_QPA_PLATFORM"] = "offscreen"
