"""Tests of the Excel door on any system: xlwings' own server code and the add-in's VBA, run without Excel."""
