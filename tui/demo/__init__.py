"""Demo designs and how their histories are made."""
