"""What is the sample? A TOML file in, a checked immutable `Stack` out.

reader       text -> TOML -> every check -> Stack
file_*       the file's tables as validated models; `document` is the whole file
places, joints, physical     checks across tables: neighbours, wire ends, materials over the sweep
complaints, lines            faults with key path and line
building     models -> sample
sample       the result, which every other room works with
schema       JSON schema of the file, for editors
"""
