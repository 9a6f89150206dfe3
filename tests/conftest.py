"""Settings of every test."""

from hypothesis import settings

# The machines are shared and slow at times: a deadline would measure them, not us.
settings.register_profile("backveer", deadline=None, max_examples=60)
settings.load_profile("backveer")
