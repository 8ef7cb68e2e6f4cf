"""Behaviours of simulated instruments, one file a kind."""
