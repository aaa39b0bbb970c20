"""The version of this package, in one place."""

VERSION = "0.1.0"
