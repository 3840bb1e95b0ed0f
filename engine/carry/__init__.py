"""Carrying steady oscillations forward: many whole periods in one stride, with what drifts beneath them."""
