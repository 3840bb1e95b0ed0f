"""What parts become: primitives with their laws, the columns that lanes vary, and the signals to observe."""
