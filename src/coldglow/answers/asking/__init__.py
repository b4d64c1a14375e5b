"""Behind `nights`: what to request, the scatter from night to night, the nights that are chosen."""
