"""What all tests share: generated input takes as long as it takes, since machines are busy; speed is measured in benchmarks."""

from hypothesis import settings

settings.register_profile("unhurried", settings(), deadline=None)
settings.load_profile("unhurried")
