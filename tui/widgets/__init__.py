"""Widgets the screens are made of."""
