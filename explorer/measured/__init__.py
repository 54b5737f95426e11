"""Measured data: read from a file, fitted, and used as inputs of a design.

Reading loads pandas and fitting loads iminuit, each when it is first asked for.
"""
