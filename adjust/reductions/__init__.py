"""From readings to observations: faces and rounds, the atmosphere of a distance, level books, and the grid sheet.

Every reduction is a pure function of arrays in metres, radians, kelvins and pascals; `read_job` calls them for the raw
tables of a job folder.
"""
