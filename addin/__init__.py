"""Hosts and commands."""
