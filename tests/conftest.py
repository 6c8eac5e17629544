"""What all tests share."""

from hypothesis import settings

# The same examples in every run, and no time limit for one: the first call of a kernel compiles.
# To look further than these: pytest --hypothesis-profile=default
settings.register_profile("repeatable", derandomize=True, deadline=None)
settings.load_profile("repeatable")
