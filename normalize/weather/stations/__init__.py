"""Finding a weather station and getting its files.

fetch : one file from an allowed host, over https, into the cache; every way it can go wrong.
cache : files that were fetched, with what the server said of them.
noaa : which files there are, and where.
lists : the archive's lists of stations.
near : stations ranked for a place.
place : a place from coordinates or a ZIP code.
zone : the thermal climate zone of a year of weather.

Nothing here is used unless a command of ``normalize weather`` asks for it.
"""
