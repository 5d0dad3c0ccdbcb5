"""The whole service as one command: a web server and two workers as child processes, watched and stopped together.

The same on Linux, macOS and Windows: a child is told to stop by the end of its standard input, which also comes
when this process is killed, so that no child is ever left behind.
"""

from labdata.supervisor.serving import PortTaken, announce, serve

__all__ = ["PortTaken", "announce", "serve"]
