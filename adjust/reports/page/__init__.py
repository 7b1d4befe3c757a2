"""`report.html`: the adjustment as one page that opens anywhere, prints, and sends nothing anywhere."""

from adjust.reports.page.render import render_page, write_page

__all__ = ["render_page", "write_page"]
