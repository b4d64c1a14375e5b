"""Behind `plan`: every answer worked out once, and turned into the report and the papers of the folder."""
