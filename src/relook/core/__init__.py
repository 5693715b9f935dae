"""The arithmetic.

Nothing here imports pandas, openpyxl, typer or rich, touches a file, prints, or asks the clock.
"""
