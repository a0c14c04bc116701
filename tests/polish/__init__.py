"""Printed coefficients brought to many digits, by solving the order conditions."""
