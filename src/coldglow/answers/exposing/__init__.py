"""Behind `expose`: where detection begins, and its words."""
