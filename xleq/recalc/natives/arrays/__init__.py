"""Arrays: made, filtered, sorted, cut and put together."""
