"""`python -m slabsim` is the command `slabsim`."""

from slabsim.cli import main

if __name__ == "__main__":
    main()
