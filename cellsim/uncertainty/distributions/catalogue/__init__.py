"""The families of distributions, one module a group; each module offers `FAMILIES`."""
