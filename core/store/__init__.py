"""Compiled graphs and finished results kept on disk, so that a table is read and solved once.

What is kept is Arrow IPC files beside a manifest that holds a checksum of each.  All of them are
checked whenever they are opened: what was tampered with, cut short or left behind by an older
version is never believed.
"""
