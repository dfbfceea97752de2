"""Writing: cached values patched into a copy of the archive, and the copy put in place safely."""
