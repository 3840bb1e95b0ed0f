"""The design document: what a design is, how it is edited and how two of them differ."""
