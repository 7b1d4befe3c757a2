"""The report while a job is watched: served on this machine only, it refreshes itself and keeps its reader's place."""

from adjust.reports.served.live import Live, live_page
from adjust.reports.served.server import PageServer

__all__ = ["Live", "PageServer", "live_page"]
