"""What runs inside LibreOffice's own Python: the standard library only, any Python from 3.8.

The extension carries these modules as the package `uffuncs_inside`. They find the user's Python and pass cell
values on to `uffuncs.calc.answers`, in this process or in a worker process.
"""
