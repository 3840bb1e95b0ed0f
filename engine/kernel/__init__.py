"""The numerical kernel: device laws, elimination, time stepping and observation of lanes."""
