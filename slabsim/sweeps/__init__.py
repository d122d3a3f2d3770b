"""Which points, in which blocks, what is left to do: running a sweep into a map."""
