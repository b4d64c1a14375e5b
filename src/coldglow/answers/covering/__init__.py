"""Behind `cover`: the question, the choice and its proof, the stare from space, what is out of reach."""
