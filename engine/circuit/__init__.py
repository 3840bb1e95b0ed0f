"""From a design document to primitives, lane tables and event segments."""
