"""Channels: one explanation of the secular braking index each."""
