"""Designs, drafts, revisions, margins and notes in SQLite. Knows no screen."""
