"""The case as a folder: case files, notes, journal, follow-up, report. The last room of byway.knowledge."""
