"""The page in a real browser: Debian's Chromium, led by Playwright."""
