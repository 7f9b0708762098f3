"""How Hypothesis draws its examples."""

from hypothesis import settings

# The same examples on every run; nothing is timed, so a busy machine cannot fail a test.
settings.register_profile("steady", derandomize=True, database=None, deadline=None)
settings.register_profile("explore", deadline=None, max_examples=1000)
settings.load_profile("steady")
