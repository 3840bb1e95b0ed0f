"""The catalogue of margins: one small file per check."""
