"""Settings that all tests share."""

from hypothesis import settings

# No time limit for a single example: the first one pays for imports, and the machine may be busy.
settings.register_profile("steady", deadline=None)
settings.load_profile("steady")
