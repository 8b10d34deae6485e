"""What all tests share: generated input takes as long as it takes, and a run that is interrupted hears it."""

import signal
import threading

from hypothesis import settings

# Machines are busy; speed is measured in benchmarks.
settings.register_profile("unhurried", settings(), deadline=None)
settings.load_profile("unhurried")

# A shell in the background ignores Ctrl-C, and all that it starts would, too.
if signal.getsignal(signal.SIGINT) is signal.SIG_IGN and threading.current_thread() is threading.main_thread():
    signal.signal(signal.SIGINT, signal.default_int_handler)
