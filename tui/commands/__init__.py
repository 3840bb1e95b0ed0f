"""Headless commands: one file each."""
