"""For all tests: no screen is needed, nothing reaches the user's own settings, and the same cases run every time.

`pytest --hypothesis-profile=explore` draws new cases at random each time; what it finds becomes a test.
"""

import os

from hypothesis import settings

os.environ["QT_QPA_PLATFORM"] = "offscreen"

settings.register_profile("same", derandomize=True, database=None, deadline=None)
settings.register_profile("explore", derandomize=False, deadline=None)
settings.load_profile("same")
