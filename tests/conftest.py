"""Property tests draw the same examples every time: same input, same output, here too."""

from hypothesis import settings

settings.register_profile("fixed", derandomize=True)
settings.load_profile("fixed")
