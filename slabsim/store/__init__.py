"""How results lie on disk: the map file, its one layout table, its writer and its reader.

Nothing outside this folder touches HDF5.
"""
