"""The terminal interface and the headless commands."""
